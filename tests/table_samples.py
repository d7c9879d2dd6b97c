"""Small tables for tests, of a plant that does not exist. All numbers are invented unless a test says otherwise."""

from __future__ import annotations

from pathlib import Path

STREAMS = """stream,side,species,datum,T [°C],h [kJ/kg],flow [kg/h]
S1,in,nitrogen,gas-25C,25,0.0000,1000
S2,out,nitrogen,gas-25C,600,621.0000,1000
S3,in,water,liquid-0C,20,84.0000,250
"""
STEAM = """tag,h [kJ/kg]
HP,2800.8
LP,2706.2
"""
STATES = """stream,species,T [°C]
S1,nitrogen,25
S2,oxygen,600
S3,methane,400
"""


def write_samples(directory: Path) -> None:
    """The files that the examples of ``convert-table`` name."""
    for name, text in (("streams", STREAMS), ("steam", STEAM), ("states", STATES)):
        (directory / f"{name}.csv").write_text(text, encoding="utf-8")
