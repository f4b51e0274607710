"""One HTML page that holds everything: no script, no reference to anything outside, pictures drawn in place."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Sequence

from levelcrossing.model import Finding, Outcome, Review, ReviewedCrossing
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import markup as clean
from levelcrossing.reports.ladder import Ladder, ladder
from levelcrossing.reports.page_style import STYLE
from levelcrossing.reports.terminal import crossing_levels, evidence, paste_lines
from levelcrossing.rulebook import RuleFile

_LEFT, _RIGHT, _WIDE = 120, 560, 800  # edges of the scale and width of the picture [picture units]


def page_report(reviews: Sequence[Review], rules: Sequence[RuleFile]) -> str:
    """Return the page of one or several reviews.

    Parameters
    ----------
    reviews : sequence of Review
    rules : sequence of RuleFile
        Those that spoke are explained at the end.

    Returns
    -------
    str
        HTML. Its policy forbids scripts, and everything from elsewhere; the only style allowed is its own.
    """
    digest = base64.b64encode(hashlib.sha256(STYLE.encode()).digest()).decode()
    policy = f"default-src 'none'; style-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    title = "Level crossings: " + ", ".join(review.board.path for review in reviews[:3])
    body = [part for number, review in enumerate(reviews) for part in _Page(review, number).parts()]
    body += _rule_texts(reviews, rules)
    return "\n".join(
        [
            "<!DOCTYPE html>",
            '<html lang="en">',
            "<head>",
            '<meta charset="utf-8">',
            f'<meta http-equiv="Content-Security-Policy" content="{policy}">',
            '<meta name="viewport" content="width=device-width, initial-scale=1">',
            '<meta name="referrer" content="no-referrer">',
            f"<title>{clean(title)}</title>",
            f"<style>{STYLE}</style>",
            "</head>",
            "<body>",
            *body,
            f'<p class="notice">{clean(phrases.NOTICE)}</p>',
            "</body>",
            "</html>",
            "",
        ]
    )


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    """Return a table; the cells are HTML already."""
    lines = ['<div class="wide"><table>', "<tr>" + "".join(f"<th>{cell}</th>" for cell in head) + "</tr>"]
    lines += ["<tr>" + "".join(f"<td>{cell}</td>" for cell in row) + "</tr>" for row in rows]
    return [*lines, "</table></div>"]


def _word(outcome: Outcome) -> str:
    return f'<span class="word {outcome.value}">{outcome.value}</span>'


def _code(text: str) -> str:
    return f"<code>{clean(text)}</code>"


class _Page:
    """Writes one board."""

    def __init__(self, review: Review, number: int) -> None:
        self.review = review
        self.number = number
        self.drawn: set[int] = set()
        self.names = {(part.reference, pin.number): pin.name for part in review.board.parts for pin in part.pins}

    def parts(self) -> list[str]:
        """Return the HTML, worst first."""
        return [*self._head(), *self._findings(), *self._waived(), *self._crossings(), *self._rails(), *self._rest()]

    def _head(self) -> list[str]:
        review = self.review
        tiles = [
            f'<li class="{outcome.value}"><b>{number}</b>{outcome.value}</li>'
            for outcome, number in phrases.outcome_counts(review)
        ]
        sound = sum(1 for one in review.crossings if one.verdict is Outcome.SOUND)
        tiles.append(f'<li class="sound"><b>{sound}</b>sound crossings</li>')
        cover = review.coverage
        return [
            f"<h1>{clean(review.board.path)}</h1>",
            f'<p class="soft">{clean(phrases.size_of(review))}; '
            f"{cover.judged} of {phrases.count(cover.signal_pins, 'signal pin')} judged.</p>",
            '<ul class="counts">',
            *tiles,
            "</ul>",
        ]

    def _findings(self) -> list[str]:
        lines: list[str] = []
        last: Outcome | None = None
        for number, finding in enumerate(phrases.open_findings(self.review), 1):
            if finding.outcome is not last:
                last = finding.outcome
                lines.append(f"<h2>{last.value.capitalize()} <small>{phrases.MEANING[last]}</small></h2>")
            lines += self._finding(number, finding)
        return lines or ["<p>Nothing found.</p>"]

    def _where(self, finding: Finding) -> str:
        where = phrases.spot(finding) or "the whole board"
        name = self.names.get((finding.part, finding.pin), "").strip("~{}")
        text = f'<span class="place">{clean(where)}</span>'
        if finding.pin and name and name != finding.pin:
            text += f" ({clean(name)})"
        if finding.part and finding.net:
            text += f' on net <span class="place">{clean(finding.net)}</span>'
        return text

    def _finding(self, number: int, finding: Finding) -> list[str]:
        one = self._crossing(finding)
        items = [("only if", clean(finding.condition)), ("remedy", clean(finding.remedy))]
        items.append(("also at", clean(phrases.places(finding.also, 24))))
        items.append(("rule", f'<a href="#rule-{clean(finding.rule)}">{clean(finding.rule)}</a>'))
        grounds = evidence(one.solved, self.review) if one is not None else []
        grounds += [source for source in finding.sources if not any(source in ground for ground in grounds)]
        grounds = [phrases.BASIS[finding.basis.value], *dict.fromkeys(grounds)]
        if phrases.grounds_known(finding):
            items.append(("rests on", "<br>".join(clean(ground) for ground in grounds)))
        if finding.at is not None and finding.at.line:
            items.append(("stands at", _code(f"{finding.at.file}:{finding.at.line}")))
        lines = [
            f'<article class="finding {finding.outcome.value}" id="finding-{self.number}-{number}">',
            f"<h3>{number}. {_word(finding.outcome)} at {self._where(finding)}</h3>",
            f"<p>{clean(finding.text)}</p>",
            "<dl>",
            *(f"<dt>{name}</dt><dd>{text}</dd>" for name, text in items if text),
            "</dl>",
        ]
        if one is not None and finding.crossing not in self.drawn and finding.outcome is not Outcome.SOUND:
            drawing = ladder(one.solved)
            if drawing is not None and drawing.notes and finding.crossing is not None:
                self.drawn.add(finding.crossing)
                lines += picture(drawing)
        return [*lines, "</article>"]

    def _crossing(self, finding: Finding) -> ReviewedCrossing | None:
        if finding.crossing is None or not 0 <= finding.crossing < len(self.review.crossings):
            return None
        return self.review.crossings[finding.crossing]

    def _waived(self) -> list[str]:
        waived = [finding for finding in self.review.findings if finding.waived is not None]
        if not waived:
            return []
        rows = [
            (_word(finding.outcome), self._where(finding), clean(finding.rule), clean(finding.waived or ""))
            for finding in waived
        ]
        return ["<h2>Accepted by waiver</h2>", *_table(("outcome", "place", "rule", "reason"), rows)]

    def _crossings(self) -> list[str]:
        if not self.review.crossings:
            return []
        rows = []
        for one in self.review.crossings:
            crossing = one.solved.crossing
            shifter = crossing.shifter.title or crossing.shifter.kind
            rows.append(
                (
                    _word(one.verdict),
                    clean(crossing.source),
                    clean(crossing.target),
                    clean(shifter + (f": {', '.join(crossing.link)}" if crossing.link else "")),
                    clean(crossing_levels(one.solved)),
                    clean(_speed(one)),
                )
            )
        head = ("verdict", "from", "to", "by way of", "at the receiver", "speed")
        return [
            "<h2>Every crossing</h2>",
            f"<details><summary>{phrases.count(len(rows), 'crossing')} from one supply to another</summary>",
            *_table(head, rows),
            "</details>",
        ]

    def _rails(self) -> list[str]:
        rails = [rail for _, rail in sorted(self.review.rails.by_net.items()) if not rail.ground]
        lines: list[str] = []
        if rails:
            rows = [
                (
                    _code(rail.net),
                    phrases.span(rail.volts) if rail.volts else "unknown",
                    rail.basis.value,
                    clean(rail.evidence[0].text if rail.evidence else ""),
                )
                for rail in rails
            ]
            lines += ["<h2>Supplies</h2>", *_table(("net", "voltage", "basis", "evidence"), rows)]
        if self.review.rails.unknown:
            rows2 = [(_code(net), clean(phrases.settling(settle))) for net, settle in self.review.rails.unknown]
            lines += ["<h2>Supplies without a voltage</h2>", *_table(("net", "what would settle it"), rows2)]
            lines.append("<p>Lines for levelcrossing.toml; put the volts, or a range such as 4.4..5.25:</p>")
            lines.append("<pre>" + "\n".join(clean(line) for line in paste_lines(self.review)) + "</pre>")
        return lines

    def _rest(self) -> list[str]:
        review = self.review
        lines: list[str] = []
        reasons = phrases.reasons(review)
        if reasons:
            rows = [(str(len(pins)), clean(why), clean(phrases.places(pins, 40))) for why, pins in reasons]
            lines += ["<h2>Not judged</h2>", *_table(("pins", "reason", "which"), rows)]
        for title, texts in (
            ("Taken for granted", review.assumptions),
            ("Out of scope", review.out_of_scope),
            ("Remarks", tuple(dict.fromkeys((*review.board.remarks, *review.remarks)))),
            ("Suggestions", review.suggestions),
        ):
            if texts:
                lines += [f"<h2>{title}</h2>", "<ul>", *(f"<li>{clean(text)}</li>" for text in texts), "</ul>"]
        if review.rows_to_fill:
            lines.append(
                "<p>Rows for those parts: put into a file, correct by the data sheet, and pass with --facts:</p>"
            )
            lines += [
                "<pre>" + "\n".join(clean(line) for line in row.splitlines()) + "</pre>" for row in review.rows_to_fill
            ]
        return lines


def _speed(one: ReviewedCrossing) -> str:
    """Return how fast a crossing is good for; nothing where its levels do not hold anyway."""
    if one.solved.speed is None or one.verdict in (Outcome.DAMAGE, Outcome.MALFUNCTION):
        return ""
    return phrases.good_for(one.solved.speed, brief=True)


def _rule_texts(reviews: Sequence[Review], rules: Sequence[RuleFile]) -> list[str]:
    spoke = {finding.rule for review in reviews for finding in review.findings}
    lines: list[str] = []
    for rule in rules:
        if rule.name in spoke:
            paragraphs = "".join(f"<p>{clean(' '.join(text.split()))}</p>" for text in rule.text.split("\n\n")[1:])
            sources = "".join(f"<li>{clean(source)}</li>" for source in rule.sources)
            lines.append(
                f'<details id="rule-{clean(rule.name)}"><summary><b>{clean(rule.name)}</b>: {clean(rule.title)}</summary>'
                f"{paragraphs}<p>Sources:</p><ul>{sources}</ul></details>"
            )
    return ["<h2>The rules that spoke</h2>", *lines] if lines else []


def picture(drawing: Ladder) -> list[str]:
    """Return a ladder as an SVG figure.

    Parameters
    ----------
    drawing : Ladder

    Returns
    -------
    list of str
        Lines of HTML.
    """
    reach = drawing.top - drawing.bottom

    def x(value: float) -> float:
        return round(_LEFT + (value - drawing.bottom) / reach * (_RIGHT - _LEFT), 1)

    top = 26
    floor = top + 30 * (len(drawing.rows) + 1)
    shapes: list[str] = []
    words = {"low": "low", "between": "?", "high": "high", "over": "too much"}
    for zone in drawing.zones:
        width = round(x(zone.high) - x(zone.low), 1)
        shapes.append(
            f'<rect class="zone-{zone.kind}" x="{x(zone.low)}" y="{top}" width="{width}" height="{floor - top}"/>'
        )
        word = words[zone.kind]
        if width > 8 * len(word) + 6:
            shapes.append(
                f'<text class="quiet" text-anchor="middle" x="{x((zone.low + zone.high) / 2)}" y="{floor - 9}">{word}</text>'
            )
    for mark in drawing.marks():
        shapes.append(f'<line class="axis" x1="{x(mark)}" x2="{x(mark)}" y1="{top - 5}" y2="{floor}"/>')
        shapes.append(
            f'<text class="quiet" text-anchor="middle" x="{x(mark)}" y="{top - 10}">{phrases.volts(mark)}</text>'
        )
    shapes.append(f'<text class="quiet" x="{_RIGHT + 14}" y="{top - 10}">V</text>')
    for number, row in enumerate(drawing.rows):
        y = top + 8 + 30 * number
        shapes.append(f'<text x="0" y="{y + 11}">{row.label} {clean(_short(row.who))}</text>')
        for bar in row.bars:
            width = max(3.0, round(x(bar.high) - x(bar.low), 1))
            shapes.append(
                f'<rect class="bar{" over" if bar.over else ""}" x="{x(bar.low)}" y="{y}" width="{width}" height="14" rx="2"/>'
            )
        shapes.append(f'<text x="{_RIGHT + 14}" y="{y + 11}">{clean(row.figures)}</text>')
    shapes.append(f'<text x="0" y="{floor - 9}">takes {clean(_short(drawing.reader))}</text>')
    last = -1000.0
    tall = floor + 18
    for name, value in drawing.limits:
        shapes.append(f'<line class="limit" x1="{x(value)}" x2="{x(value)}" y1="{top}" y2="{floor + 4}"/>')
        # Labels of limits that lie close together go one line lower each.
        low = floor + 18 if x(value) - last > 70 else floor + 34
        tall = max(tall, low)
        last = x(value)
        shapes.append(f'<text text-anchor="middle" x="{x(value)}" y="{low}">{name} {phrases.volts(value)}</text>')
    says = "; ".join(f"{row.label} {row.who}: {row.figures}" for row in drawing.rows)
    says += "; " + ", ".join(f"{name} {phrases.volts(value)} V" for name, value in drawing.limits)
    caption = [f"set by {drawing.source}"] if drawing.source else []
    caption += [*drawing.notes, "limits at their least favourable corner"]
    return [
        "<figure>",
        f'<svg viewBox="0 0 {_WIDE} {tall + 6}" role="img" aria-label="{clean(says)}">',
        *shapes,
        "</svg>",
        f"<figcaption>{'<br>'.join(clean(text) for text in caption)}</figcaption>",
        "</figure>",
    ]


def _short(text: str) -> str:
    return text if len(text) <= 11 else text[:10] + "…"
