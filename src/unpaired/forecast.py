"""What a run would do: sizes, memory and time of every point, and a refusal of what cannot fit."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from . import machine
from .errors import InputError
from .layout import layout
from .point import Point
from .recipe.recipe import Recipe
from .study import Plan, plan

GIB = 2**30


def forecast_report(recipes: Sequence[Recipe]) -> str:
    """One line per level: atoms, electrons, basis functions, memory and time expected on this machine.

    Raises InputError for a structure that cannot be used and for a level that cannot fit in memory.
    """
    from .electronic.cost import estimate

    plans = [plan(recipe) for recipe in recipes]
    require_memory(plans)
    head = [
        "radical",
        "level",
        "atoms",
        "electrons",
        "charge",
        "2S+1",
        "basis functions",
        "memory / GiB",
        "time / s",
    ]
    lines, total_s = [], 0.0
    for planned in plans:
        for point in planned.points:
            cost = estimate(point)
            total_s += cost.seconds
            lines.append(
                [
                    planned.recipe.radical,
                    point.level.id,
                    str(len(point.molecule.elements)),
                    str(point.molecule.electrons),
                    f"{point.molecule.charge:+d}" if point.molecule.charge else "0",
                    str(point.molecule.multiplicity),
                    str(cost.basis_functions),
                    f"{cost.memory_bytes / GIB:.2f}",
                    f"{cost.seconds:.1f}",
                ]
            )
    text = layout(head, lines, left=2)
    text += f"{len(lines)} points, about {total_s:.0f} s on {machine.cores()} cores\n"
    text += "times: from a multiplication of matrices timed just now; a level whose first answer is doubtful "
    text += "tries other starts and can take several times as long\n"
    rough = [planned.recipe.radical for planned in plans if planned.recipe.relax]
    if rough:
        text += f"relaxed first, which is not in these times: {', '.join(rough)}\n"
    return text


def require_memory(plans: Sequence[Plan], finished: Callable[[Point], bool] = lambda point: False) -> None:
    """Raise InputError, naming what to change, if a point that is not finished needs more memory than there is."""
    available = machine.memory_bytes()
    problems = []
    for planned in plans:
        for level, point in zip(planned.recipe.levels, planned.points, strict=True):
            if finished(point):
                continue
            from .electronic.cost import estimate  # sizes of fitting sets take a second to look up

            cost = estimate(point)
            if cost.memory_bytes > available:
                problems.append(
                    f"{planned.recipe.path}: {level.id} needs about {cost.memory_bytes / GIB:.1f} GiB of memory "
                    f"and {available / GIB:.1f} GiB are free: close other programs, take a smaller basis set "
                    f"than {level.basis} ({cost.basis_functions} functions), or accuracy: quick"
                )
    if problems:
        raise InputError("\n".join(problems))
