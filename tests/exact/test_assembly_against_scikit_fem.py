"""Our geometry factors against scikit-fem's assembled forms: the same matrices, from quadrature that knows nothing of our formulas."""

import numpy as np
import pytest
from skfem import Basis, BilinearForm, ElementTriP1, FacetBasis, LinearForm, MeshTri
from skfem.helpers import dot, grad

from fem.mesh.make import make_mesh
from fem.section.build import Outline, OutlineEdge, build_plan
from fem.solve.assembly import Assembly

RING = Outline(
    "ring",
    True,
    ((0.02, 0.0), (0.07, 0.0), (0.07, 0.03), (0.02, 0.03)),
    (OutlineEdge("bottom"), OutlineEdge("out", (0.075, 0.015)), OutlineEdge("top"), OutlineEdge("in")),
)
QUADRATURE = 4  # exact for the products of linear functions and r


@pytest.fixture(scope="module", params=["planar", "revolution"])
def pair(request):
    mesh = make_mesh(build_plan([RING], kind=request.param))
    assembly = Assembly(mesh, revolution=request.param == "revolution")
    return assembly, MeshTri(mesh.points.T.copy(), mesh.cells.T.copy())


def weight(assembly, x):
    return 2.0 * np.pi * x[0] if assembly.revolution else 1.0 + 0.0 * x[0]


def test_conduction_matrix(pair):
    assembly, theirs = pair
    k = np.random.default_rng(3).uniform(0.1, 40.0, len(assembly.mesh.cells))

    @BilinearForm
    def conduction(u, v, w):
        return w["k"] * weight(assembly, w.x) * dot(grad(u), grad(v))

    basis = Basis(theirs, ElementTriP1(), intorder=QUADRATURE)
    per_point = np.repeat(k[:, None], basis.dx.shape[1], axis=1)
    other = conduction.assemble(basis, k=per_point)
    ours = assembly.stiffness(k)
    assert abs(ours - other).max() <= 1e-12 * abs(other).max()


def test_volumes_are_row_sums_of_the_mass_matrix(pair):
    assembly, theirs = pair

    @BilinearForm
    def mass(u, v, w):
        return weight(assembly, w.x) * u * v

    rows = np.asarray(mass.assemble(Basis(theirs, ElementTriP1(), intorder=QUADRATURE)).sum(axis=1)).ravel()
    (share,) = assembly.volumes
    np.testing.assert_allclose(share.size, rows[share.nodes], rtol=1e-12)


def test_surfaces_are_loads_of_a_unit_flux(pair):
    assembly, theirs = pair
    curves = tuple(i for i, curve in enumerate(assembly.mesh.plan.curves) if "ring.out" in curve.labels)
    share = assembly.surface(curves)
    wanted = np.sort(assembly.mesh.facets[np.isin(assembly.mesh.curve, curves)], axis=1)
    keys = {tuple(f) for f in wanted.tolist()}
    facets = np.array([i for i, f in enumerate(np.sort(theirs.facets.T, axis=1).tolist()) if tuple(f) in keys])

    @LinearForm
    def flux(v, w):
        return weight(assembly, w.x) * v

    load = flux.assemble(FacetBasis(theirs, ElementTriP1(), facets=facets, intorder=QUADRATURE))
    np.testing.assert_allclose(share.size, load[share.nodes], rtol=1e-12)
    assert share.size.sum() == pytest.approx(load.sum(), rel=1e-12)
