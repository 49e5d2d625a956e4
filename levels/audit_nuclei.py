"""Audit rule on nuclei: the neutral atom and its ions share them, so their files must say the same."""

import math
from itertools import combinations

from levels.audit_structure import Broken
from levels.catalogue import Catalogue
from levels.records import Isotope

FACTS = ("mass", "abundance", "half_life", "moment", "quadrupole")


def one_nucleus(catalogue: Catalogue) -> Broken:
    """One nucleus has one spin, mass, abundance, half-life, moment and quadrupole moment, whatever the charge.

    Numbers may differ by rounding: to the last digit of the coarser of the two, or within its uncertainty.
    """
    by_nucleus: dict[tuple[str, int], list[Isotope]] = {}
    for isotope in catalogue.atoms():
        by_nucleus.setdefault((isotope.symbol, isotope.mass_number), []).append(isotope)
    for charges in by_nucleus.values():
        for one, other in combinations(charges, 2):
            where = f"{other.name}: isotopes.{other.mass_number}"
            if one.twice_I != other.twice_I:
                yield f"{where}.spin", f"differs from that of {one.name}"
            yield from ((f"{where}.{name}", message) for name, message in _differences(one, other))


def _differences(one: Isotope, other: Isotope) -> Broken:
    for name in FACTS:
        first, second = getattr(one, name), getattr(other, name)
        if first is None or second is None:
            continue
        spreads = [item.uncertainty or abs(item.value) * 1e-9 for item in (first, second)]
        if not math.isclose(first.value, second.value, rel_tol=1e-9, abs_tol=0.5 * max(spreads)):
            yield name, f"{second.text} here, {first.text} in the file of {one.name}"
