"""Two pieces of evidence give a rail different voltages, or a regulator cannot give what is asked of it.

Why: a net called +3V3 behind a 2.5 V regulator is a wrong part or a wrong name; every level on it is then judged against
the wrong figure. A regulator without enough input does not reach its output.

What to do: correct the part number, the divider or the name; or declare the rail in the settings.

Speaks when regulator, feedback divider, name, connector or settings disagree by more than their tolerances, when the
input of a regulator is below its output plus dropout, or above its maximum.

Stays quiet when all evidence fits.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome

NAME = "rail-conflict"
OUTCOME = Outcome.DAMAGE
SOURCES = ("the regulator's data sheet, as named with the finding", "net naming habits: common practice")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per disagreement."""
    outcomes = {"conflict": Outcome.MALFUNCTION, "dropout": Outcome.MARGINAL, "input-range": Outcome.DAMAGE}
    for remark in case.rails.remarks:
        yield Finding(
            rule=NAME,
            outcome=Outcome.MARGINAL
            if remark.kind == "conflict" and _near(case, remark.net)
            else outcomes.get(remark.kind, Outcome.MARGINAL),
            text=remark.text,
            remedy=remark.remedy,
            part=remark.part,
            net=remark.net,
            basis=remark.basis,
            cause=f"rail {remark.kind} {remark.net} {remark.part}",
        )


def _near(case: CaseFile, net: str) -> bool:
    """Tell whether the voltages that evidence gives a rail lie within a tenth of each other."""
    rail = case.rails.by_net.get(net)
    volts = (
        [evidence.volts.nominal for evidence in rail.evidence if evidence.volts is not None] if rail is not None else []
    )
    return bool(volts) and max(volts) <= 1.1 * min(volts)
