"""SPICE decks of all solved crossings, one file per crossing and state, for anyone who checks with a simulator."""

from __future__ import annotations

from levelcrossing.decks import deck
from levelcrossing.model import CaseFile
from levelcrossing.solutions import network_of, planned_states


def deck_files(case: CaseFile) -> dict[str, str]:
    """Return the decks at nominal values.

    Parameters
    ----------
    case : CaseFile

    Returns
    -------
    dict
        File name to text, in the order of the crossings. The number in a name is that of the crossing in the JSON form.
    """
    files: dict[str, str] = {}
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        driver = f"{crossing.driver.part}.{crossing.driver.number}" if crossing.driver else crossing.driver_rail
        for state in planned_states(crossing):
            if state not in solved.states or not solved.states[state].solved:
                continue
            network = network_of(crossing, case.islands, case.rails, state)
            remarks = (f"from {crossing.source}", f"to {crossing.target}", f"driver {state}, every value nominal")
            name = f"{index:03d}_{driver}_to_{crossing.receiver.part}.{crossing.receiver.number}_{state}"
            files[_safe(name) + ".cir"] = deck(network, f"crossing {index}, {state}", remarks=remarks)
    return files


def _safe(name: str) -> str:
    """Return a file name of plain characters: names come from a board, which may be a stranger's."""
    kept = (
        character if character.isascii() and (character.isalnum() or character in "-_.") else "_" for character in name
    )
    return "".join(kept).replace("..", "_")[:120]
