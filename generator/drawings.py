"""Structure drawings as SVG, on request with the arrow of the dipole moment.

Drawings follow the text colour of the page (`currentColor`), so one serves light and dark pages
and print. rdkit is imported inside the functions.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from generator.conformers import parse
from generator.dipoles import moments

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from rdkit.Chem import Mol

    Array = NDArray[np.float64]

BOND_LENGTH = 30
"""[px] Bond length where the canvas has room for it."""

SHORTEST_ARROW = 0.2
"""[D] Smaller moments, as seen in the plane of the drawing, get no arrow."""

IN_PLANE_SHARE = 0.4
"""Moments that mostly point out of the plane of the drawing get no arrow."""

LIKELY_CONFORMER = 0.1
"""Only conformers with at least this Boltzmann weight may stand for the drawn shape."""


class Likely(NamedTuple):
    """The conformers that may stand for the drawn shape.

    `positions` [Å] of shape (conformers, atoms, 3), `moments` [D] of shape (conformers, 3).
    """

    positions: Array
    moments: Array


def likely(smiles: str) -> Likely | None:
    """The conformers that may stand for the drawn shape; None outside the model of dipoles."""
    try:
        found = moments(smiles)
    except ValueError:
        return None
    kept = found.weights >= min(LIKELY_CONFORMER, float(found.weights.max()))
    return Likely(found.shapes.positions[kept], found.vectors[kept])


def drawing(
    smiles: str,
    width: int = 220,
    height: int = 160,
    dark: bool = False,
    dipole: bool = False,
    shapes: Likely | None = None,
) -> str:
    """Structure drawing as an SVG element of `width` × `height` [px].

    The background is transparent and all strokes are `currentColor`; `dark` is accepted for
    callers that ask for a dark page and changes nothing. There are no ids and no XML header; the
    element carries role="img" and waits for the caller's title. Equal structures give equal
    text, byte for byte.

    With `dipole`, the estimated moment is drawn beside the structure, by the convention of
    chemistry: the crossed tail at the positive end, the head toward the negative end. The
    conformer is the likely one whose shape comes closest to the drawing, turned into the plane of
    the paper. No arrow is drawn where its moment in that plane is below 0.2 D, or where the model
    says nothing about the molecule. `shapes` are the likely conformers where they are at hand.
    Raises `ValueError` for an unreadable structure.
    """
    from rdkit import Chem
    from rdkit.Chem import rdDepictor
    from rdkit.Chem.Draw import rdMolDraw2D

    mol = parse(smiles)
    if dipole and mol.GetNumHeavyAtoms() == 1:
        mol = Chem.AddHs(mol)  # the shape of water shows only with its hydrogen atoms
    rdDepictor.SetPreferCoordGen(False)
    rdDepictor.Compute2DCoords(mol, canonOrient=True)
    rdDepictor.StraightenDepiction(mol)
    direction = _direction(shapes or likely(smiles), mol) if dipole else None
    canvas = rdMolDraw2D.MolDraw2DSVG(width, height)
    options: Any = canvas.drawOptions()
    options.clearBackground = False
    options.useBWAtomPalette()
    options.bondLineWidth = 1.6
    options.scaleBondWidth = False
    options.fixedBondLength = BOND_LENGTH
    options.fixedFontSize = 13
    options.padding = 0.06 if direction is None else 0.16
    options.explicitMethyl = mol.GetNumHeavyAtoms() <= 3
    rdMolDraw2D.PrepareAndDrawMolecule(canvas, mol)
    canvas.FinishDrawing()
    arrow = ""
    if direction is not None:
        points = [canvas.GetDrawCoords(index) for index in range(mol.GetNumAtoms())]
        places = np.array([(point.x, point.y) for point in points])
        # downward is positive on the canvas
        arrow = _arrow(places, direction * np.array([1.0, -1.0]), width, height)
    return _clean_svg(canvas.GetDrawingText(), arrow, width, height)


def _direction(shapes: Likely | None, mol: Mol) -> Array | None:
    """Unit vector on the paper from the positive to the negative end, None for no arrow."""
    if shapes is None:
        return None
    count = mol.GetNumAtoms()
    # adding hydrogen atoms keeps the numbers of the others, so atoms match one to one
    flat = np.zeros((count, 3))
    flat[:, :2] = mol.GetConformer().GetPositions()[:, :2]
    flat -= flat.mean(axis=0)
    best: tuple[float, Array] | None = None
    for points, vector in zip(*shapes, strict=True):
        for mirrored in (1.0, -1.0):  # a mirror image has the same moment, mirrored
            shape = (points[:count] - points[:count].mean(axis=0)) * [1.0, 1.0, mirrored]
            moment = vector * [1.0, 1.0, mirrored]
            turn = _rotation(shape, flat)
            off = float(((shape @ turn - flat) ** 2).sum())
            turned = _into_plane(flat, moment @ turn)
            if best is None or off < best[0] - 1e-6:
                best = (off, turned)
    if best is None:
        return None
    in_plane = float(np.hypot(*best[1][:2]))
    if in_plane < max(SHORTEST_ARROW, IN_PLANE_SHARE * float(np.linalg.norm(best[1]))):
        return None
    arrow: Array = -best[1][:2] / in_plane
    return arrow


def _rotation(shape: Array, target: Array) -> Array:
    """Rotation that brings row vectors closest to a target: Kabsch, Acta Cryst. A32 (1976) 922."""
    u, _, vt = np.linalg.svd(shape.T @ target)
    proper = np.diag([1.0, 1.0, float(np.sign(np.linalg.det(u @ vt)))])
    turn: Array = u @ proper @ vt
    return turn


def _into_plane(flat: Array, moment: Array) -> Array:
    """Turn a moment about the line of a linear drawing until it lies in the paper, upward."""
    _, extents, axes = np.linalg.svd(flat)
    if len(extents) > 1 and extents[1] > 1e-3:
        return moment
    axis = axes[0]
    across = np.array([-axis[1], axis[0], 0.0])
    if across[1] < 0:
        across = -across
    along = float(moment @ axis)
    upward = float(np.sqrt(max(0.0, float(moment @ moment) - along**2)))
    turned: Array = along * axis + upward * across
    return turned


def _arrow(places: Array, direction: Array, width: int, height: int) -> str:
    """The crossed arrow, beside the structure where there is room, as SVG paths [px]."""
    normal = np.array([-direction[1], direction[0]])
    middle = (places.max(axis=0) + places.min(axis=0)) / 2
    along = (places - middle) @ direction
    half = min(30.0, max(16.0, float(np.ptp(along)) * 0.35))
    across = (places - middle) @ normal
    # half a label with its hydrogen atoms is up to 18 px wide, and 7 px high
    gap = 8.0 + 18.0 * abs(float(normal[0])) + 7.0 * abs(float(normal[1]))
    options = [
        middle + normal * (float(across.max()) + gap),
        middle + normal * (float(across.min()) - gap),
    ]

    def overhang(centre: Array) -> float:
        ends = np.array([centre - half * direction, centre + half * direction])
        low, high = ends.min() - 4.0, (ends - [width, height]).max() + 4.0
        return max(0.0, -float(low), float(high))

    # below or to the right when both fit: the eye reads the structure first
    options.sort(key=lambda centre: (round(overhang(centre), 3), -centre[1], -centre[0]))
    centre = options[0]
    ends = np.array([centre - half * direction, centre + half * direction])
    # 5 px: half the cross stroke and half the head
    centre = centre + np.maximum(0.0, 5.0 - ends.min(axis=0))
    centre = centre - np.maximum(0.0, ends.max(axis=0) + 5.0 - np.array([width, height]))
    tail, head = centre - half * direction, centre + half * direction
    cross = tail + 5.0 * direction
    left, right = head - 7.0 * direction + 3.5 * normal, head - 7.0 * direction - 3.5 * normal

    def move(*points: Array) -> str:
        return "M" + "L".join(f"{x:.1f},{y:.1f}" for x, y in points)

    shaft = move(tail, head - 5.0 * direction) + move(cross + 4.0 * normal, cross - 4.0 * normal)
    return (
        f'<path class="dipole" d="{shaft}" fill="none" stroke="currentColor" '
        f'stroke-width="1.4"/>\n'
        f'<path class="dipole" d="{move(head, left, right)}Z" fill="currentColor"/>'
    )


_KEPT = ("fill", "stroke", "stroke-width", "stroke-dasharray")


def _attributes(style: str) -> str:
    """What a style says, as attributes: a strict Content-Security-Policy ignores styles."""
    said = dict(part.split(":") for part in style.split(";") if part)
    return " ".join(f'{name}="{said[name].removesuffix("px")}"' for name in _KEPT if name in said)


def _clean_svg(text: str, extra: str, width: int, height: int) -> str:
    """Keep the shapes of a drawing, as short as possible, and colour them by the page."""
    marker = "<!-- END OF HEADER -->"
    body = text[text.index(marker) + len(marker) : text.rindex("</svg>")]
    body = re.sub(r" class='[^']*'", "", body)
    body = re.sub(r"style='([^']*)'", lambda found: _attributes(found[1]), body)
    body = re.sub(r"#[0-9A-Fa-f]{6}", "currentColor", body)
    body = body.replace(" />", "/>").replace("'", '"')
    lines = [line.strip() for line in body.splitlines() if line.strip()]
    if extra:
        lines.append(extra)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" '
        f'viewBox="0 0 {width} {height}" role="img">' + "\n".join(lines) + "</svg>"
    )
