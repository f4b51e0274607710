"""A stranger's text, put into every place that a board supplies, changes words of a report and nothing else."""

from __future__ import annotations

import json
import re
import unicodedata
from html.parser import HTMLParser
from xml.etree import ElementTree

import pytest
from hostile import HOSTILE, parsed_command
from markdown_it import MarkdownIt
from sample_review import sample_review

from levelcrossing.railtree import rail_tree
from levelcrossing.reports.clean import annotation, annotation_property, markdown, place_path, visible
from levelcrossing.reports.jsonform import json_report
from levelcrossing.reports.junit import junit_report
from levelcrossing.reports.markdown import markdown_report
from levelcrossing.reports.page import page_report
from levelcrossing.reports.quality import quality_report
from levelcrossing.reports.sarif import sarif_report
from levelcrossing.reports.sheet import cells
from levelcrossing.reports.terminal import coloured_report, plain_report
from levelcrossing.reports.workflow import workflow_report
from levelcrossing.rulebook import load_rules

RULES = load_rules()
BASE = "/home/guest/board"

every_text = pytest.mark.parametrize("text", HOSTILE, ids=range(len(HOSTILE)))


@pytest.mark.parametrize(
    "text", ["1. one", "2) two", "- item", "-", "---", "===", "+ plus", "# head", "> quote", "    code", "1.", "10)"]
)
def test_no_sentence_begins_a_block(text: str) -> None:
    tokens = MarkdownIt("commonmark").enable("table").parse(f"above\n\n{markdown(text)}\n\nabove\n{markdown(text)}\n")
    assert {token.type for token in tokens} == {"paragraph_open", "inline", "paragraph_close"}


def test_plain_sentences_stay_readable() -> None:
    sentence = "U1.5 (TX) gives 3.13 V against 3.67 V at worst; add a 2-input gate."
    assert markdown(sentence) == "`U1.5` (TX) gives 3.13 V against 3.67 V at worst; add a `2-input` gate."


def test_there_are_enough_of_them() -> None:
    assert len(set(HOSTILE)) >= 60


def harmless(line: str) -> bool:
    """Tell whether a line holds nothing that a terminal obeys or a build host reads as a command."""
    obeyed = any(unicodedata.category(character) in ("Cc", "Cf", "Cs", "Co", "Zl", "Zp") for character in line)
    return not obeyed and not line.strip().startswith("::") and "##[" not in line and "##vso" not in line


@every_text
@pytest.mark.parametrize("width", [60, 80, 140])
def test_plain_text(text: str, width: int) -> None:
    report = plain_report([sample_review(text, text)], width=width, everything=True)
    for line in report.removesuffix("\n").split("\n"):
        assert harmless(line), line
        assert cells(line) <= width, line


@every_text
def test_colours_add_nothing_but_colours(text: str) -> None:
    reviews = [sample_review(text, text)]
    coloured = coloured_report(reviews, width=90, everything=True)
    bare = re.sub(r"\x1b\[[0-9;]*m", "", coloured)
    lines = [line.rstrip() for line in bare.split("\n")]
    assert lines == plain_report(reviews, width=90, everything=True).split("\n")


@every_text
def test_ascii_text_is_ascii(text: str) -> None:
    assert plain_report([sample_review(text, text)], everything=True, ascii_only=True).isascii()


@every_text
def test_rail_tree(text: str) -> None:
    for line in rail_tree(text, sample_review(text).rails).removesuffix("\n").split("\n"):
        assert harmless(line), line


@every_text
def test_json_keeps_every_character_and_shows_none(text: str) -> None:
    report = json_report([sample_review(text, text)])
    assert report.isascii()
    assert all(character.isprintable() or character == "\n" for character in report)
    read = json.loads(report)
    assert read["findings"][0]["text"] == text
    assert read["crossings"][0]["to"]["name"] == text
    assert read["board"]["path"] == text


@every_text
def test_sarif(text: str) -> None:
    report = sarif_report([sample_review(text, text)], RULES, base=BASE)
    assert report.isascii()
    run = json.loads(report)["runs"][0]
    assert len(run["results"]) == 5
    for result in run["results"]:
        assert "](" not in result["message"]["text"]
        for location in result.get("locations", ()):
            uri = location.get("physicalLocation", {}).get("artifactLocation", {}).get("uri")
            assert uri is None or re.fullmatch(r"(?!\.\.?(/|$))[A-Za-z0-9_.~%-][A-Za-z0-9_.~%/-]*", uri), uri
            assert uri is None or ".." not in uri.split("/")


def blocks(markdown: str) -> list[tuple[str, str, int]]:
    tokens = MarkdownIt("commonmark", {"html": True}).enable(["table", "strikethrough"]).parse(markdown)
    return [(token.type, token.tag, token.level) for token in tokens]


def inline_types(markdown: str) -> set[str]:
    tokens = MarkdownIt("commonmark", {"html": True}).enable(["table", "strikethrough"]).parse(markdown)
    return {child.type for token in tokens for child in token.children or ()}


@every_text
def test_markdown_has_no_links_no_html_and_an_unmoved_structure(text: str) -> None:
    if not text.strip():
        return  # nothing is shown of it, and an empty paragraph is one block less
    report = markdown_report([sample_review(text, text)], base=BASE)
    assert inline_types(report) <= {
        "text",
        "code_inline",
        "softbreak",
        "em_open",
        "em_close",
        "strong_open",
        "strong_close",
    }
    usual = markdown_report([sample_review()], base=BASE)
    # A path that leads out of the folder is not shown as a place, which takes one item away.
    drop = 0 if place_path(text, BASE) else 2
    assert (
        len([block for block in blocks(report) if block[0] == "list_item_open"])
        == len([block for block in blocks(usual) if block[0] == "list_item_open"]) - drop
    )
    for kind in (
        "heading_open",
        "hr",
        "fence",
        "code_block",
        "table_open",
        "blockquote_open",
        "ordered_list_open",
        "html_block",
    ):
        assert [block for block in blocks(report) if block[0] == kind] == [
            block for block in blocks(usual) if block[0] == kind
        ]


@every_text
def test_markdown_leaves_nothing_bare_that_a_host_would_link(text: str) -> None:
    """Addresses, mentions and issue numbers stand in code spans only."""
    report = markdown_report([sample_review(text, text)], base=BASE)
    tokens = MarkdownIt("commonmark").enable("table").parse(report)
    bare = " ".join(child.content for token in tokens for child in token.children or () if child.type == "text")
    assert not re.search(r"://|www\.|@\w|#\d|\w\.example|javascript:", bare), bare


# -------------------------------------------------------------------------------------------------- workflow commands


@every_text
def test_annotations_read_back(text: str) -> None:
    report = workflow_report([sample_review(text, text)], base=BASE)
    lines = report.removesuffix("\n").split("\n")
    assert [parsed_command(line)[0] for line in lines] == ["error", "error", "warning", "notice", "notice"]
    _, properties, message = parsed_command(lines[0])
    assert set(properties) <= {"file", "line", "title"}
    assert properties["title"] == visible(
        f"damage: input-overvoltage at {text}.{text}" if text else "damage: input-overvoltage"
    )
    assert message.startswith(visible(text))
    if "file" in properties:
        assert place_path(properties["file"]) == properties["file"]
        assert int(properties["line"]) >= 1
    for line in lines:
        assert all(character.isprintable() for character in line)


@every_text
def test_escaping_of_commands_is_lossless(text: str) -> None:
    line = f"::error title={annotation_property(text)}::{annotation(text)}"
    if "\n" not in line and "\r" not in line and text.isprintable():
        assert parsed_command(line)[1:] == ({"title": text}, text)
    assert "\n" not in line and "\r" not in line


# --------------------------------------------------------------------------------------------------------------- HTML


class Outline(HTMLParser):
    """Collects the tags of a page with their attributes' names."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[tuple[str, ...]] = []
        self.hrefs: set[str] = set()
        self.strange: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, *(name for name, _ in attrs)))
        for name, value in attrs:
            if name in ("href", "src", "xlink:href"):
                self.hrefs.add(value or "")

    def handle_comment(self, data: str) -> None:
        self.strange.append(data)

    unknown_decl = handle_pi = handle_comment


def outline(page: str) -> Outline:
    parser = Outline()
    parser.feed(page)
    parser.close()
    return parser


USUAL_TAGS = {tag[0] for tag in outline(page_report([sample_review()], RULES)).tags}


@every_text
def test_page(text: str) -> None:
    read = outline(page_report([sample_review(text, text)], RULES))
    assert {tag[0] for tag in read.tags} <= USUAL_TAGS
    assert "script" not in USUAL_TAGS and "img" not in USUAL_TAGS and "iframe" not in USUAL_TAGS
    assert not any(name.startswith("on") or name == "style" for tag in read.tags for name in tag[1:])
    assert read.hrefs <= {f"#rule-{rule.name}" for rule in RULES}
    assert not read.strange
    for quiet in ("article", "svg", "table", "h2", "figure"):
        usual = [tag for tag in outline(page_report([sample_review()], RULES)).tags if tag[0] == quiet]
        if text.strip():
            assert [tag for tag in read.tags if tag[0] == quiet] == usual


@every_text
def test_junit(text: str) -> None:
    report = junit_report([sample_review(text, text)])
    root = ElementTree.fromstring(report)
    assert (root.get("tests"), root.get("failures"), root.get("skipped")) == ("7", "2", "3")
    assert {element.tag for element in root.iter()} == {
        *("testsuites", "testsuite", "testcase", "failure", "skipped", "system-out")
    }


@every_text
def test_quality(text: str) -> None:
    report = quality_report([sample_review(text, text)], base=BASE)
    assert report.isascii()
    entries = json.loads(report)
    assert len({entry["fingerprint"] for entry in entries}) == len(entries) == 4
    for entry in entries:
        path = entry["location"]["path"]
        assert path and not path.startswith("/") and ".." not in path.split("/")
