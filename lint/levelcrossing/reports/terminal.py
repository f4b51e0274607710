"""The report for people: plain text for a pipe, coloured by rich for a terminal."""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import dataclass

from levelcrossing.model import Finding, Outcome, Rail, Review, ReviewedCrossing, SolvedCrossing
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import terminal as clean
from levelcrossing.reports.ladder import Ladder, ladder
from levelcrossing.reports.phrases import NOTICE, count, spot, volts
from levelcrossing.reports.sheet import Segment, Sheet, cells

STYLES = {
    "damage": "bold red",
    "malfunction": "bold magenta",
    "marginal": "bold yellow",
    "unknown": "bold cyan",
    "sound": "bold green",
    "dim": "dim",
    "title": "bold",
    "place": "bold",
    "over": "red",
    "high": "green",
    "low": "green",
    "between": "yellow",
    "bar": "bold",
}
"""Style names of the page -> rich styles; chosen from the sixteen colours that every terminal theme adapts."""

INDENT = 11  # columns of the margin that holds the labels
NARROWEST, WIDEST = 60, 140
MOST_ROWS = 3
PROSE_WIDEST = 110


@dataclass(frozen=True, slots=True, kw_only=True)
class Glyphs:
    """The characters that a ladder is drawn with."""

    bar: str
    low: str
    between: str
    high: str
    over: str
    edge: str
    tick: str
    rule: str


UNICODE = Glyphs(bar="█", low="▁", between="·", high="▔", over="╳", edge="│", tick="┴", rule="─")
ASCII = Glyphs(bar="#", low="_", between=".", high="=", over="x", edge="|", tick="+", rule="-")


def plain_report(
    reviews: Sequence[Review], *, width: int = 100, everything: bool = False, ascii_only: bool = False
) -> str:
    """Return the report as plain text.

    Parameters
    ----------
    reviews : sequence of Review
    width : int
        Columns.
    everything : bool
        Show sound crossings and every rail too.
    ascii_only : bool
        For an output that cannot show other characters.

    Returns
    -------
    str
        Lines of at most ``width`` columns, with a newline at the end.
    """
    text = compose(reviews, width=width, everything=everything, glyphs=ASCII if ascii_only else UNICODE).plain()
    return text.encode("ascii", "backslashreplace").decode("ascii") if ascii_only else text


def coloured_report(
    reviews: Sequence[Review], *, width: int, everything: bool = False, ascii_only: bool = False
) -> str:
    """Return the report with the terminal's colours; the arguments are those of ``plain_report``."""
    sheet = compose(reviews, width=width, everything=everything, glyphs=ASCII if ascii_only else UNICODE)
    return coloured(sheet)


def coloured(sheet: Sheet) -> str:
    """Return a page with terminal colours."""
    from rich.console import Console

    buffer = io.StringIO()
    console = Console(
        file=buffer,
        width=sheet.width,
        force_terminal=True,
        color_system="standard",
        highlight=False,
        markup=False,
        emoji=False,
    )
    draw(sheet, console)
    return buffer.getvalue()


def draw(sheet: Sheet, console: object) -> None:
    """Print a page on a rich console."""
    from rich.console import Console
    from rich.text import Text

    assert isinstance(console, Console)
    for line in sheet.lines:
        text = Text.assemble(*((content, STYLES.get(style, "")) for content, style in line))
        text.rstrip()
        console.print(text, no_wrap=True, overflow="ignore", crop=False, soft_wrap=True)


def compose(reviews: Sequence[Review], *, width: int, everything: bool, glyphs: Glyphs) -> Sheet:
    """Lay out the report of one or several boards."""
    sheet = Sheet(width=max(NARROWEST, min(width, WIDEST)))
    if len(reviews) > 1:
        _overview(sheet, reviews)
    for review in reviews:
        _Board(sheet, review, everything, glyphs).write()
    sheet.blank()
    sheet.text(NOTICE, style="dim")
    return sheet


def _overview(sheet: Sheet, reviews: Sequence[Review]) -> None:
    total = [
        (outcome, sum(review.count(outcome) for review in reviews))
        for outcome in Outcome
        if outcome is not Outcome.SOUND
    ]
    shown = ", ".join(f"{number} {outcome.value}" for outcome, number in total if number) or "nothing found"
    sheet.line((f"{count(len(reviews), 'board')}: {shown}", "title"))
    ranked = sorted(reviews, key=lambda review: [-number for _, number in phrases.outcome_counts(review)])
    sheet.rows([(review.board.path, phrases.headline(review)) for review in ranked], indent=2)
    sheet.blank()


class _Board:
    """Writes the report of one board onto a sheet."""

    def __init__(self, sheet: Sheet, review: Review, everything: bool, glyphs: Glyphs) -> None:
        self.sheet = sheet
        self.review = review
        self.everything = everything
        self.glyphs = glyphs
        self.names = {(part.reference, pin.number): pin.name for part in review.board.parts for pin in part.pins}
        self.drawn: dict[int, int] = {}

    def write(self) -> None:
        """Write everything, worst first."""
        self._head()
        self._findings()
        self._sound()
        self._waived()
        self._unknown_rails()
        self._coverage()
        self._rails()
        self._taken()

    def _section(self, title: str, remark: str = "") -> None:
        self.sheet.blank()
        lead = self.glyphs.rule * 2
        room = min(self.sheet.width, PROSE_WIDEST)
        beside = 6 + cells(title) + 2 + cells(remark) + 3 <= room
        shown = f"  {remark}" if remark and beside else ""
        tail = self.glyphs.rule * max(2, room - 4 - cells(title) - cells(shown))
        self.sheet.line((lead + " ", "dim"), (title, "title"), (shown, "dim"), (" " + tail, "dim"))
        if remark and not beside:
            self.sheet.text(remark, indent=3, style="dim")

    def _head(self) -> None:
        review, sheet = self.review, self.sheet
        sheet.blank()
        sheet.text(review.board.path, style="title")
        segments: list[Segment] = [("  ", "")]
        found = [(outcome, number) for outcome, number in phrases.outcome_counts(review) if number]
        for outcome, number in found:
            segments += [(f"{number} {outcome.value}", outcome.value), ("   ", "")]
        if not found:
            segments.append(("nothing found", "sound"))
        sheet.line(*segments)
        verdicts = [f"{number} {outcome.value}" for outcome, number in phrases.verdict_counts(review) if number]
        crossings = f"{count(len(review.crossings), 'crossing')} from one supply to another" + (
            f": {', '.join(verdicts)}" if verdicts else ""
        )
        cover = review.coverage
        sheet.text(f"{crossings}. {cover.judged} of {count(cover.signal_pins, 'signal pin')} judged.", indent=2)
        sheet.text(f"Read: {phrases.size_of(review)}.", indent=2, style="dim")

    # ---------------------------------------------------------------------------------------------------- findings

    def _findings(self) -> None:
        last: Outcome | None = None
        for number, finding in enumerate(phrases.open_findings(self.review), 1):
            if finding.outcome is not last:
                last = finding.outcome
                self._section(last.value, phrases.MEANING[last])
            self._finding(number, finding)

    def _finding(self, number: int, finding: Finding) -> None:
        sheet = self.sheet
        sheet.blank()
        where = self._where(finding)
        at = f"{finding.at.file}:{finding.at.line}" if finding.at and finding.at.line else ""
        head: list[Segment] = [
            (f"{number:>3}  ", "dim"),
            (finding.outcome.value, finding.outcome.value),
            ("  ", ""),
            (clean(where), "place"),
        ]
        head.append((f"  {finding.rule}", "dim"))
        used = sum(cells(text) for text, _ in head)
        if used > sheet.width:
            sheet.line(*head[:3])
            sheet.text(where, indent=5, style="place")
            sheet.text(finding.rule, indent=5, style="dim")
        else:
            sheet.line(*head)
        if at:
            sheet.text(at, indent=5, style="dim")
        self._labelled("what", finding.text)
        if finding.condition:
            self._labelled("only if", finding.condition)
        if finding.remedy:
            self._labelled("remedy", finding.remedy)
        if finding.also:
            self._labelled("also at", phrases.places(finding.also))
        for index, ground in enumerate(self._grounds(finding) if phrases.grounds_known(finding) else ()):
            self._labelled("" if index else "rests on", ground)
        self._ladder(number, finding)

    def _labelled(self, label: str, text: str) -> None:
        narrow = Sheet(width=min(self.sheet.width, PROSE_WIDEST))
        narrow.text(text, indent=5 + INDENT - 1, label=f"     {label}")
        self.sheet.lines.extend(narrow.lines)

    def _where(self, finding: Finding) -> str:
        where = spot(finding)
        name = self.names.get((finding.part, finding.pin), "").strip("~{}")
        if finding.pin and name and name != finding.pin:
            where += f" ({name})"
        if finding.part and finding.net:
            where += f" on net {finding.net}"
        return where or "the whole board"

    def _grounds(self, finding: Finding) -> list[str]:
        solved = self._solved(finding)
        words = evidence(solved, self.review) if solved is not None else []
        # A source that an end's evidence quotes already would stand there twice.
        words += [source for source in finding.sources if not any(source in word for word in words)]
        return [phrases.BASIS[finding.basis.value], *dict.fromkeys(words)]

    def _solved(self, finding: Finding) -> SolvedCrossing | None:
        if finding.crossing is None or not 0 <= finding.crossing < len(self.review.crossings):
            return None
        return self.review.crossings[finding.crossing].solved

    # ------------------------------------------------------------------------------------------------------ ladder

    def _ladder(self, number: int, finding: Finding) -> None:
        solved = self._solved(finding)
        if solved is None or finding.crossing is None or finding.outcome is Outcome.SOUND:
            return
        if finding.crossing in self.drawn:
            self._labelled("ladder", f"drawn at finding {self.drawn[finding.crossing]}")
            return
        drawing = ladder(solved)
        # Comfortable levels are not what the finding is about; a ladder would only distract.
        if drawing is not None and drawing.notes:
            self.drawn[finding.crossing] = number
            self.sheet.blank()
            draw_ladder(self.sheet, drawing, self.glyphs)

    # -------------------------------------------------------------------------------------------------- the others

    def _sound(self) -> None:
        sound = [one for one in self.review.crossings if one.verdict is Outcome.SOUND]
        if not sound:
            return
        if not self.everything:
            self._section("sound", f"{count(len(sound), 'crossing')} at every corner; --all shows them")
            return
        self._section("sound", "holds at every corner")
        for one in sound:
            self.sheet.blank()
            self.sheet.text(_way(one), indent=5, style="place")
            if one.condition:
                self._labelled("only if", one.condition)
            self._labelled("levels", crossing_levels(one.solved))
            if one.solved.speed is not None:
                self._labelled("speed", phrases.good_for(one.solved.speed))
            self._labelled("rests on", "; ".join(evidence(one.solved, self.review)) or one.solved.crossing.basis.value)

    def _waived(self) -> None:
        waived = [finding for finding in self.review.findings if finding.waived is not None]
        if waived:
            self._section("accepted by waiver")
            rows = [
                (finding.outcome.value, self._where(finding), finding.rule, f"because: {finding.waived}")
                for finding in waived
            ]
            self.sheet.rows(rows)

    def _unknown_rails(self) -> None:
        unknown = self.review.rails.unknown
        if unknown:
            self._section("supplies without a voltage", "what would settle each")
            self.sheet.rows([(net, phrases.settling(settle)) for net, settle in unknown])
        lines = paste_lines(self.review)
        if lines:
            self.sheet.blank()
            self.sheet.text(
                "Lines for levelcrossing.toml beside the project; put the volts, or a range such as 4.4..5.25:",
                indent=2,
            )
            for line in lines:
                self.sheet.text(line, indent=4, style="title")

    def _coverage(self) -> None:
        cover = self.review.coverage
        self._section("coverage", f"{cover.judged} of {count(cover.signal_pins, 'signal pin')} judged")
        if cover.better_than_assumed:
            self.sheet.text(f"{cover.better_than_assumed} of them on better than assumed figures.", indent=2)
        most = None if self.everything else 8
        groups = phrases.reasons(self.review)
        self.sheet.rows([(str(len(pins)), f"{why}: {phrases.places(pins, 8)}") for why, pins in groups[:most]])
        if most is not None and len(groups) > most:
            rest = sum(len(pins) for _, pins in groups[most:])
            self.sheet.text(
                f"and {count(rest, 'pin')} for {count(len(groups) - most, 'other reason')}; --all shows them", indent=2
            )

    def _rails(self) -> None:
        used = {one.solved.crossing.driver_rail for one in self.review.crossings} | {
            one.solved.crossing.receiver_rail for one in self.review.crossings
        }
        rails = [rail for _, rail in sorted(self.review.rails.by_net.items()) if not rail.ground]
        shown = rails if self.everything else [rail for rail in rails if rail.net in used and rail.volts is not None]
        if shown:
            self._section(
                "supplies", "" if self.everything else "those that crossings meet; `levelcrossing rails` shows all"
            )
            self.sheet.rows([rail_row(rail) for rail in shown])

    def _taken(self) -> None:
        review = self.review
        for title, texts in (
            ("taken for granted", review.assumptions),
            ("out of scope", review.out_of_scope),
            ("remarks", tuple(dict.fromkeys((*review.board.remarks, *review.remarks)))),
            ("suggestions", review.suggestions),
        ):
            if texts:
                self._section(title)
                most = len(texts) if self.everything else 12
                for text in texts[:most]:
                    self.sheet.text(text, indent=4, label="  -")
                if len(texts) > most:
                    self.sheet.text(f"and {len(texts) - most} more; --all shows them", indent=4)
        self._rows_to_fill()

    def _rows_to_fill(self) -> None:
        rows = self.review.rows_to_fill
        if not rows:
            return
        most = len(rows) if self.everything else MOST_ROWS
        self.sheet.blank()
        self.sheet.text(
            "Rows for those parts: put into a file, correct by the data sheet, and pass with --facts:", indent=2
        )
        for row in rows[:most]:
            self.sheet.blank()
            for line in row.splitlines():
                self.sheet.line(("    " + clean(line), "title"))
        if len(rows) > most:
            self.sheet.text(f"and {len(rows) - most} more; --all shows them", indent=4)


def rail_row(rail: Rail) -> tuple[str, str, str]:
    """Return net, voltage and evidence of a rail for a table."""
    voltage = phrases.span(rail.volts) if rail.volts is not None else "unknown"
    first = rail.evidence[0].text if rail.evidence else ""
    return rail.net, voltage, f"{rail.basis.value}: {first}" if first else rail.basis.value


def paste_lines(review: Review) -> list[str]:
    """Return settings lines for the rails without a voltage, ready to paste once a voltage is filled in."""
    nets = [net for net, _ in review.rails.unknown]
    if not nets:
        return []
    return ["[rails]", *(f'{_toml(net)} = "?"' for net in nets[:12])]


def _toml(text: str) -> str:
    return '"' + clean(text).replace("\\", "\\\\").replace('"', '\\"') + '"'


def _way(one: ReviewedCrossing) -> str:
    crossing = one.solved.crossing
    link = f" through {', '.join(crossing.link)}" if crossing.link and crossing.driver is not None else ""
    return f"{crossing.source} to {crossing.target}{link} ({crossing.shifter.title or crossing.shifter.kind})"


def crossing_levels(solved: SolvedCrossing) -> str:
    """Return what arrives at a receiver against its limits, in one line."""
    words = []
    if solved.high is not None:
        words.append(f"high {phrases.span(solved.high)}" + (f" (VIH {volts(solved.vih.high)})" if solved.vih else ""))
    if solved.low is not None:
        words.append(f"low {phrases.span(solved.low)}" + (f" (VIL {volts(solved.vil.low)})" if solved.vil else ""))
    if solved.vmax is not None:
        words.append(f"at most {volts(solved.vmax.low)} V")
    return ", ".join(words) or "not solved"


def evidence(solved: SolvedCrossing, review: Review) -> list[str]:
    """Return where the figures of a crossing come from: supplies first, then both ends."""
    crossing = solved.crossing
    rails = []
    for net in dict.fromkeys((crossing.driver_rail, crossing.receiver_rail)):
        rail = review.rails.by_net.get(net)
        if rail is not None and rail.volts is not None:
            rails.append(f"{net} at {phrases.span(rail.volts)} ({rail.basis.value})")
    words = [", ".join(rails)] if rails else []
    if crossing.driver is not None and crossing.driver.drive is not None and crossing.driver.drive.source:
        words.append(_taken_as(crossing.driver.part, "drives", crossing.driver.drive.source))
    if crossing.receiver.receive is not None and crossing.receiver.receive.source:
        words.append(_taken_as(crossing.receiver.part, "reads", crossing.receiver.receive.source))
    return words


def _taken_as(part: str, does: str, source: str) -> str:
    """Return a part with the source of its figures; what is assumed is a sentence of its own."""
    return f"{part}: {source}" if " is assumed" in source else f"{part} {does} as {source}"


def draw_ladder(sheet: Sheet, drawing: Ladder, glyphs: Glyphs) -> None:
    """Draw a ladder with characters: a scale, the levels sent and arriving, and what the receiver makes of them."""
    names = [clean(row.who) for row in drawing.rows] + [clean(drawing.reader)]
    lead = 15 + min(max(cells(name) for name in names), 12)
    tail = 2 + max(cells(row.figures) for row in drawing.rows)
    beside = sheet.width - lead - tail - 1 >= 26  # else the figures get lines of their own
    room = min(sheet.width - lead - (tail + 1 if beside else 6), 72)
    reach = drawing.top - drawing.bottom

    def column(value: float) -> int:
        return max(0, min(room, round((value - drawing.bottom) / reach * room)))

    scale = [" "] * (room + 4)
    axis = [glyphs.rule] * (room + 1)
    free_from = 0
    for mark in drawing.marks():
        at = column(mark)
        axis[at] = glyphs.tick
        name = volts(mark)
        if at >= free_from:
            scale[at : at + len(name)] = list(name)
            free_from = at + len(name) + 1
    sheet.line((" " * lead, ""), ("".join(scale).rstrip() + " V", "dim"))
    sheet.line((" " * lead, ""), ("".join(axis), "dim"))
    limit = next((value for name, value in drawing.limits if name == "max"), None)
    for row in drawing.rows:
        paint: list[Segment] = [(" ", "") for _ in range(room + 1)]
        for bar in row.bars:
            first, last = column(bar.low), column(bar.high)
            for at in range(first, max(last, first) + 1):
                over = bar.over and limit is not None and drawing.bottom + at / room * reach > limit
                paint[at] = (glyphs.bar, "over" if over else "bar")
        label = f"     {row.label:<8} {clean(row.who)}"
        sheet.line((_fit(label, lead), ""), *_joined(paint), ("  " + row.figures if beside else "", ""))
        if not beside:
            sheet.text(row.figures, indent=lead)
    marks = {"low": glyphs.low, "between": glyphs.between, "high": glyphs.high, "over": glyphs.over}
    view: list[Segment] = [(" ", "") for _ in range(room + 1)]
    for zone in drawing.zones:
        first, last = column(zone.low), column(zone.high)
        for at in range(first, last + 1):
            view[at] = (marks[zone.kind], zone.kind)
        word = {"low": "low", "between": "?", "high": "high", "over": "too much"}[zone.kind]
        if last - first - 1 >= len(word) + 2:
            start = first + 1 + (last - first - 1 - len(word)) // 2
            for offset, character in enumerate(word):
                view[start + offset] = (character, zone.kind)
    for _, value in drawing.limits:
        view[column(value)] = (glyphs.edge, "")
    sheet.line((_fit(f"     takes    {clean(drawing.reader)}", lead), ""), *_joined(view))
    limits = ", ".join(f"{name} {volts(value)}" for name, value in drawing.limits)
    sheet.text(f"{limits} V (each at its least favourable corner)", indent=lead, style="dim")
    if drawing.source:
        sheet.text(f"set by {drawing.source}", indent=lead)
    for note in drawing.notes:
        sheet.text(note, indent=lead, style="over")


def _fit(text: str, width: int) -> str:
    while cells(text) > width - 1:
        text = text[:-2] + "…" if text.endswith("…") else text[:-1] + "…"
    return text + " " * (width - cells(text))


def _joined(cells_of_line: list[Segment]) -> list[Segment]:
    joined: list[Segment] = []
    for text, style in cells_of_line:
        if joined and joined[-1][1] == style:
            joined[-1] = (joined[-1][0] + text, style)
        else:
            joined.append((text, style))
    return joined
