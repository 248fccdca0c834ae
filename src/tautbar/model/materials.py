"""Materials and sections from their checked words."""

from __future__ import annotations

from typing import Any

from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import Material, Section

_FROM_MATERIAL = ("expansion", "yield_strength", "retardation_time")


def build_materials(words: dict[str, Any]) -> dict[str, Material]:
    """Materials by name; wrong ones are left out."""
    return {name: Material(name, **data) for name, data in words.items() if data is not None}


def build_sections(
    words: dict[str, Any], materials: dict[str, Material], known: set[str], mistakes: Mistakes
) -> dict[str, Section]:
    """Sections by name with what their material gives filled in.

    ``known`` are the names of all materials, wrong ones included.
    """
    sections = {}
    for name, data in words.items():
        if data is None:
            sections[name] = Section(name)
            continue
        _check_ways(name, data, mistakes)
        material = data.get("material")
        if material is not None and material not in known:
            mistakes.add(
                ("sections", name, "material"), f"there is no material '{material}'", near(material, known)
            )
        sections[name] = _section(name, data, materials.get(material or ""))
    return sections


def _check_ways(name: str, data: dict[str, Any], mistakes: Mistakes) -> None:
    """Exactly one of the three ways to say how stiff the section is."""
    direct = [key for key in ("axial_stiffness", "stiffness") if key in data]
    by_material = "material" in data and "area" in data
    path = ("sections", name)
    if len(direct) + by_material > 1:
        given = [*direct, "material and area"] if by_material else direct
        mistakes.add(
            (*path, direct[-1]), f"the stiffness is given twice: {', '.join(given)}", "give one of them"
        )
    elif not direct and not by_material:
        lacking = [key for key in ("material", "area") if key not in data]
        hint = "give material and area, or axial_stiffness, or stiffness"
        mistakes.add(
            path, f"'{lacking[0]}' is missing" if len(lacking) == 1 else "the stiffness is missing", hint
        )


def _section(name: str, data: dict[str, Any], material: Material | None) -> Section:
    values = dict(data)
    area = values.get("area")
    if material is not None:
        for key in _FROM_MATERIAL:
            values.setdefault(key, getattr(material, key))
        if area is not None and "axial_stiffness" not in values and "stiffness" not in values:
            values["axial_stiffness"] = material.modulus and material.modulus * area
        if area is not None and material.density is not None:
            values.setdefault("mass_per_length", material.density * area)
    return Section(name, **values)
