"""A hand-made, invented book of realistic size: three catalysts, five levels, two runs each, twelve products."""

from __future__ import annotations

from collections.abc import Sequence

from coulombook.book import Book, Cell, InputFile, Table
from coulombook.findings import Finding, finding

PRODUCTS = (
    ("hydrogen", "H2", "gas", 2, 31.0),
    ("carbon monoxide", "C1", "gas", 2, 7.0),
    ("methane", "C1", "gas", 8, 2.6),
    ("formate", "C1", "liquid", 2, 11.3),
    ("methanol", "C1", "liquid", 6, 0.11),
    ("ethylene", "C2", "gas", 12, 24.6),
    ("ethane", "C2", "gas", 14, 0.031),
    ("ethanol", "C2", "liquid", 12, 10.2),
    ("acetate", "C2", "liquid", 8, 1.4),
    ("acetaldehyde", "C2", "liquid", 10, 0.8),
    ("n-propanol", "C3", "liquid", 18, 5.1),
    ("allyl alcohol", "C3", "liquid", 16, 0.72),
)
CATALYSTS = ("annealed copper mesh", "polished copper foil", "silver foam")
POTENTIALS = (-0.6174, -0.7386, -0.8512, -0.9433, -1.0481)


def sample_book(
    catalysts: Sequence[str] = CATALYSTS,
    levels: Sequence[float] = POTENTIALS,
    products: Sequence[tuple[str, str, str, int, float]] = PRODUCTS,
    replicates: int = 2,
    findings: Sequence[Finding] = (),
) -> Book:
    ledger: list[dict[str, Cell]] = []
    summary: list[dict[str, Cell]] = []
    series: list[dict[str, Cell]] = []
    for c, catalyst in enumerate(catalysts):
        for p, potential in enumerate(levels):
            level, current = f"{-1.2 - 0.2 * p:.1f}", 3.1 * 1.8**p
            share = {name: size * (1 + 0.13 * p - 0.05 * c) for name, _, _, _, size in products}
            for r in range(replicates):
                run = f"{catalyst[0]}{p + 1}{'abc'[r]}"
                head: dict[str, Cell] = {
                    "run": run,
                    "catalyst": catalyst,
                    "electrode": f"{catalyst[0]}{r}",
                    "level": level,
                    "E vs RHE / V": potential + 0.002 * r,
                }
                total = 94.6 + 1.7 * r + 0.4 * p
                summary.append(
                    head
                    | {
                        "u(E vs RHE) / V": 0.0031,
                        "charge / C": current * 3.6,
                        "j / mA cm^-2": current * (1 + 0.02 * r),
                        "total FE / %": total,
                        "u(total FE) / %": 1.63,
                        "H2 FE / %": 31.0,
                        "C1 FE / %": 21.4,
                        "C2+ FE / %": 42.9,
                        "u(C2+ FE) / %": 0.91,
                        "C2+/C1": 2.0047,
                        "u(C2+/C1)": 0.061,
                        "C2+/C1 molar": 0.36,
                        "roughness factor": 61.2,
                        "u(roughness factor)": 3.3,
                        "CO2 conversion / %": 0.84,
                        "closure": "short" if total < 95 else "closed",
                    }
                )
                ledger.extend(
                    head
                    | {
                        "product": name,
                        "group": group,
                        "phase": phase,
                        "electrons": electrons,
                        "FE / %": share[name],
                        "u(FE) / %": share[name] * 0.031,
                        "status": "below detection"
                        if name == "ethane" and p == 0
                        else "above calibration"
                        if name == "ethylene" and p == 4
                        else "quantified",
                    }
                    for name, group, phase, electrons, _ in products
                )
            series.extend(
                {
                    "catalyst": catalyst,
                    "level": level,
                    "E vs RHE / V": potential + 0.001,
                    "product": name,
                    "runs": replicates,
                    "FE / %": share[name],
                    "s(FE) / %": share[name] * 0.02,
                    "u(FE) / %": share[name] * 0.024,
                }
                for name, *_ in products
            )
    tables = {
        "ledger": Table.of("ledger", ledger),
        "summary": Table.of("summary", summary),
        "series": Table.of("series", series),
    }
    return Book(
        "2043-05-18 mesh, foil and foam",
        "Annealed mesh against silver foam (invented)",
        tables,
        tuple(findings),
        (InputFile("runs.csv", "ab" * 32, 1234),),
        {"outlet_flow": "inlet"},
    )


def sample_findings() -> tuple[Finding, ...]:
    return (
        finding("assumed-default", "runs.csv", "no temperature is given; 25 degC was taken"),
        *(
            finding(
                "balance-open",
                f"run m{n}a",
                f"the total Faradaic efficiency is 8{n % 10}.2 %, with a standard uncertainty of 1.6 %",
                "look for a product that nothing measures, or a flow entered too low",
            )
            for n in range(14)
        ),
        finding(
            "unread-column",
            "gas.csv, row 1, column 'opérateur'",
            "the column is not known; it is carried along",
        ),
    )
