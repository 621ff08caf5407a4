"""All tables together: find a part by name, and look for what is odd in them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TypeVar

from buckdesign.errors import UnknownNameError
from buckdesign.parts.cores import InductanceFactor, LossPoint, Material, Ring
from buckdesign.parts.kinds import Capacitor, Rectifier, Regulator, Transistor, Wire
from buckdesign.parts.names import name_key, pair_key

_Part = TypeVar("_Part")

CERTAINTIES = (
    "looked up", "from memory", "derived", "common practice", "invented", "measured", "fitted", "user",
)  # fmt: skip
"""Words a cell `how` begins with."""


@dataclass(frozen=True, kw_only=True)
class Problem:
    """Something odd in a table.

    Attributes
    ----------
    kind, name : str
        Kind and name of the part.
    text : str
        What is odd.
    """

    kind: str
    name: str
    text: str

    def __str__(self) -> str:
        return f"{self.kind} {self.name}: {self.text}"

    @property
    def name_key(self) -> str:
        """The name as it is found, see `buckdesign.parts.names.name_key`; of a pair each by itself."""
        return pair_key(*self.name.split(", "))


@dataclass(frozen=True, kw_only=True)
class Tables:
    """Parts by name, in the order of their tables.

    Attributes
    ----------
    regulators, transistors, rectifiers, capacitors, wires, rings, materials : dict
        Parts by name.
    inductance_factors : dict
        Published A_L by names of ring and material, the preferred one first.
    loss_points : dict
        Published points of core loss by name of the material.
    """

    regulators: dict[str, Regulator]
    transistors: dict[str, Transistor]
    rectifiers: dict[str, Rectifier]
    capacitors: dict[str, Capacitor]
    wires: dict[str, Wire]
    rings: dict[str, Ring]
    materials: dict[str, Material]
    inductance_factors: dict[tuple[str, str], tuple[InductanceFactor, ...]]
    loss_points: dict[str, tuple[LossPoint, ...]]

    def regulator(self, name: str) -> Regulator:
        """The regulator of a name.

        Parameters
        ----------
        name : str
            Case and spaces do not count.

        Returns
        -------
        Regulator
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("regulator", name, self.regulators)

    def transistor(self, name: str) -> Transistor:
        """The transistor of a name.

        Parameters
        ----------
        name : str
            Case and spaces do not count.

        Returns
        -------
        Transistor
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("transistor", name, self.transistors)

    def rectifier(self, name: str) -> Rectifier:
        """The rectifier of a name.

        Parameters
        ----------
        name : str
            Case and spaces do not count.

        Returns
        -------
        Rectifier
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("rectifier", name, self.rectifiers)

    def capacitor(self, name: str) -> Capacitor:
        """The capacitor of a name.

        Parameters
        ----------
        name : str
            Case and spaces do not count.

        Returns
        -------
        Capacitor
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("capacitor", name, self.capacitors)

    def wire(self, name: str) -> Wire:
        """The wire of a name.

        Parameters
        ----------
        name : str
            ``1.0 mm``, ``1 mm``, ``AWG 18``, ``18 AWG``.

        Returns
        -------
        Wire
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("wire", name, self.wires)

    def ring(self, name: str) -> Ring:
        """The ring of a name.

        Parameters
        ----------
        name : str
            ``R 26.9/14.5/11.1``, ``26.9/14.5/11.1``.

        Returns
        -------
        Ring
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("ring", name, self.rings)

    def material(self, name: str) -> Material:
        """The material of a name.

        Parameters
        ----------
        name : str
            Case and spaces do not count.

        Returns
        -------
        Material
            The row of the table.

        Raises
        ------
        UnknownNameError
            With the nearest names, if there is none.
        """
        return self._find("material", name, self.materials)

    def inductance_factor(self, ring: str, material: str) -> InductanceFactor | None:
        """The preferred published A_L of a ring in a material.

        Parameters
        ----------
        ring, material : str
            Names.

        Returns
        -------
        InductanceFactor or None
            Not suspect before suspect, looked up before recalled; a user's row before both. None where no
            publication has the pair.

        Raises
        ------
        UnknownNameError
            If one of the names is in no table.
        """
        core, substance = self.ring(ring), self.material(material)
        found = self.inductance_factors.get((core.name, substance.name))
        if found is None and substance.al_as:
            found = self.inductance_factors.get((core.name, substance.al_as))
        return found[0] if found else None

    def check(self) -> list[Problem]:
        """What is odd in the tables, none of it an error.

        Returns
        -------
        list of Problem
            Suspect values, names that are in no table, missing origin, parts that lack what a study needs.
        """
        return [*self._odd_origins(), *self._odd_references(), *self._odd_values()]

    @cached_property
    def _keys(self) -> dict[str, dict[str, str]]:
        return {kind: {name_key(name): name for name in parts} for kind, parts in self._by_kind().items()}

    def _by_kind(self) -> Mapping[str, Mapping[str, object]]:
        return {
            "regulator": self.regulators,
            "transistor": self.transistors,
            "rectifier": self.rectifiers,
            "capacitor": self.capacitors,
            "wire": self.wires,
            "ring": self.rings,
            "material": self.materials,
        }

    def _find(self, kind: str, name: str, parts: Mapping[str, _Part]) -> _Part:
        exact = parts.get(name)
        if exact is not None:
            return exact
        known = self._keys[kind].get(name_key(name))
        if known is None:
            raise UnknownNameError.among(kind, name, parts)
        return parts[known]

    def _odd_origins(self) -> Iterator[Problem]:
        for kind, parts in self._by_kind().items():
            for name, part in parts.items():
                how = getattr(part, "how", "")
                if not how.startswith(CERTAINTIES):
                    yield Problem(
                        kind=kind, name=name, text=f"how = {how}: begin with {', '.join(CERTAINTIES)}"
                    )

    def _odd_references(self) -> Iterator[Problem]:
        for (ring, material), factors in self.inductance_factors.items():
            if ring not in self.rings:
                yield Problem(kind="inductance factor", name=ring, text="this ring is in no table")
            if material not in self.materials:
                yield Problem(kind="inductance factor", name=material, text="this material is in no table")
            for factor in factors:
                if factor.suspect:
                    yield Problem(kind="inductance factor", name=f"{ring}, {material}", text=factor.suspect)
        for material in self.loss_points:
            if material not in self.materials:
                yield Problem(kind="loss point", name=material, text="this material is in no table")
        for name, substance in self.materials.items():
            for attribute in ("al_as", "loss_as"):
                other = getattr(substance, attribute)
                if other and other not in self.materials:
                    yield Problem(kind="material", name=name, text=f"{attribute} = {other} is in no table")

    def _odd_values(self) -> Iterator[Problem]:
        with_factor = {ring for ring, _ in self.inductance_factors}
        for name in self.rings:
            if name not in with_factor:
                yield Problem(
                    kind="ring", name=name, text="no published A_L; it is computed from the dimensions"
                )
        powders = {name: one for name, one in self.materials.items() if one.kind == "iron powder"}
        for name, substance in powders.items():
            if substance.loss_coefficients is None:
                yield Problem(kind="material", name=name, text="no core loss coefficients")
            if substance.bias_field is None:
                yield Problem(kind="material", name=name, text="no law of permeability under DC bias")
