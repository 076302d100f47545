"""`--mass`: what it cannot be, and what goes before it."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

SAMPLES = Path(__file__).resolve().parent.parent / "sample_logs"


def scan(mass: str) -> subprocess.CompletedProcess[str]:
    log, fleet = SAMPLES / "zz-nma" / "nma-0902.csv", SAMPLES / "fleet.yaml"
    command = [sys.executable, "-m", "exceed", "scan", str(log), "--fleet", str(fleet), "--mass", mass]
    return subprocess.run(command, capture_output=True, text=True, check=False)


def test_a_mass_below_the_empty_mass_is_refused():
    done = scan("2 kg")
    assert done.returncode == 3
    assert "--mass 2 kg is less than the empty mass of 640 kg" in done.stdout


def test_a_loading_sheet_goes_before_it_and_that_is_said():
    done = scan("900 kg")
    assert done.returncode == 0
    assert "--mass is not used for flight 1: the loading sheet goes before it" in done.stdout
