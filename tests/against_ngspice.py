"""Runs decks in ngspice, many to a process, and reads what it computed. A helper of tests and benchmarks."""

from __future__ import annotations

import subprocess
import tempfile
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from levelcrossing.decks import Step, deck, safe_names
from levelcrossing.network import Network


def run_raw(decks: Sequence[str], commands: Sequence[str], *, timeout_s: float = 60.0) -> list[dict[str, np.ndarray]]:
    """Run each deck's command in one process; return its vectors by lower-case name (empty when it failed)."""
    with tempfile.TemporaryDirectory() as folder:
        lines = ["* runner", ".control", "set filetype=binary", "set ngbehavior=0"]
        for number, (text, command) in enumerate(zip(decks, commands, strict=True)):
            (Path(folder) / f"d{number}.cir").write_text(text)
            lines += [f"source d{number}.cir", command, f"write d{number}.raw", "destroy all", "remcirc"]
        lines += ["quit", ".endc", ".end", ""]
        (Path(folder) / "runner.cir").write_text("\n".join(lines))
        done = subprocess.run(
            ["ngspice", "-b", "-n", "runner.cir"], cwd=folder, capture_output=True, timeout=timeout_s, check=False
        )
        out = []
        for number in range(len(decks)):
            path = Path(folder) / f"d{number}.raw"
            out.append(read_raw(path.read_bytes()) if path.exists() else {})
        if not any(out):
            raise RuntimeError(done.stdout.decode()[-2000:] + done.stderr.decode()[-2000:])
        return out


def read_raw(data: bytes) -> dict[str, np.ndarray]:
    """Return the vectors of a binary raw file."""
    head, _, body = data.partition(b"Binary:\n")
    text = head.decode("latin-1")
    fields = dict(line.split(":", 1) for line in text.splitlines() if ":" in line and not line.startswith("\t"))
    variables, points = int(fields["No. Variables"]), int(fields["No. Points"])
    names = [line.split("\t")[2] for line in text.splitlines() if line.startswith("\t")][:variables]
    table = np.frombuffer(body, dtype="<f8", count=variables * points).reshape(points, variables)
    return {name.lower(): table[:, column].copy() for column, name in enumerate(names)}


def node_volts(network: Network, vectors: dict[str, np.ndarray], node: str) -> np.ndarray:
    safe = safe_names(network).nodes[node]
    return vectors[f"v({safe})"] if f"v({safe})" in vectors else vectors[safe]


def dc_volts(cases: Sequence[tuple[Network, int]], *, tolerance: float = 1e-6) -> list[dict[str, float]]:
    """Return by case the voltage of every unknown node as ngspice computes it [V]; nothing where it failed."""
    decks = [deck(network, "dc", member=member, tolerance=tolerance) for network, member in cases]
    raw = run_raw(decks, ["op"] * len(decks))
    return [
        {node: float(node_volts(network, vectors, node)[-1]) for node in network.nodes} if vectors else {}
        for (network, _), vectors in zip(cases, raw, strict=True)
    ]


def waves(
    cases: Sequence[tuple[Network, int, Step]], *, tolerance: float = 1e-4, points: int = 2000
) -> list[tuple[Network, dict[str, np.ndarray]]]:
    """Return by case the vectors of a transient run."""
    decks = [deck(net, "step", member=member, step=step, tolerance=tolerance) for net, member, step in cases]
    commands = []
    for *_, step in cases:
        longest = step.until_s / points
        commands.append(f"tran {longest:.6g} {step.until_s:.6g} 0 {longest:.6g}")
    raw = run_raw(decks, commands)
    return [(case[0], vectors) for case, vectors in zip(cases, raw, strict=True)]
