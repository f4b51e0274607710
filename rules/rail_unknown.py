"""A supply rail has no known voltage.

Why: nothing that this rail supplies can be judged.

What to do: declare the rail; the finding ends with the line to put into levelcrossing.toml.

Speaks when supply pins of integrated circuits are on a net whose voltage neither a regulator nor a name, a connector or
the settings give.

Stays quiet when the voltage is known, and for nets that supply no signal pin.
"""

from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome

NAME = "rail-unknown"
OUTCOME = Outcome.UNKNOWN
SOURCES = ("none needed: what is not known is said",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per rail without a voltage."""
    for net, settle in case.rails.unknown:
        supplied = sorted(
            {reference for (reference, _), pin in case.pins.items() if pin.net == net and pin.role == "supply"}
        )
        who = ", ".join(supplied[:6]) + (f" and {len(supplied) - 6} more" if len(supplied) > 6 else "")
        text = f"Nothing tells the voltage of {net}" + (f", which supplies {who}." if supplied else ".")
        yield Finding(
            rule=NAME,
            outcome=Outcome.UNKNOWN,
            text=text,
            remedy=settle,
            net=net,
            part=supplied[0] if supplied else "",
            basis=Basis.ASSUMED,
            cause=f"rail {net}",
        )
