"""Library values against the sources that they name, as general property libraries carry them, and against physics.

Carriers: `ht` (DIN EN 12524, ASHRAE Handbook Fundamentals 2013, VDI Heat Atlas); `thermo` and `chemicals` (Ho, Powell
and Liley 1972; NIST-JANAF; Perry; CRC densities); `CoolProp` (fluids; Choi and Okos food components). A property called
published must be checked by one: `test_published_value_agrees_with_a_second_carrier` fails where none is known.
"""

import re

import numpy as np
import pytest
from chemicals.volume import rho_data_CRC_inorg_s_const
from CoolProp.CoolProp import PropsSI
from ht.insulation import ASHRAE, ASHRAE_k, building_materials, refractories
from thermo.heat_capacity import HeatCapacitySolid
from thermo.thermal_conductivity import ThermalConductivitySolid

from fem.stock.models import PROPERTIES, library

LIBRARY = library()
ZERO = 273.15

ELEMENTS = {  # CAS number, molar mass in g/mol
    "aluminium, pure": ("7429-90-5", 26.981538),
    "copper, pure": ("7440-50-8", 63.546),
    "nickel, pure": ("7440-02-0", 58.6934),
    "titanium, pure": ("7440-32-6", 47.867),
    "zinc, pure": ("7440-66-6", 65.38),
    "lead, pure": ("7439-92-1", 207.2),
    "magnesium, pure": ("7439-95-4", 24.305),
    "silver, pure": ("7440-22-4", 107.8682),
    "tungsten": ("7440-33-7", 183.84),
    "molybdenum": ("7439-98-7", 95.96),
    "silicon": ("7440-21-3", 28.0855),
}
COMPOUNDS = ELEMENTS | {
    "magnesium oxide, dense": ("1309-48-4", 40.3044),
    "silicon carbide, sintered": ("409-21-2", 40.0962),
    "zirconia ceramic 3Y-TZP": ("1314-23-4", 123.222),
    "graphite, isostatic": ("7782-42-5", 12.011),
}
FLUIDS = {
    "water, at rest": "Water",
    "air, at rest": "Air",
    "argon, at rest": "Argon",
    "nitrogen, at rest": "Nitrogen",
    "carbon dioxide, at rest": "CarbonDioxide",
    "helium, at rest": "Helium",
    "ethylene glycol 50 % in water, at rest": "INCOMP::MEG[0.5]",
    "propylene glycol 40 % in water, at rest": "INCOMP::MPG[0.4]",
    "ice": "INCOMP::FoodIce",
}
BRICKS = {
    "fireclay brick": "Fireclay",
    "fireclay brick, high duty": "High-duty fireclay",
    "sillimanite brick": "Sillimanite",
    "mullite brick": "Mullite",
    "high-alumina brick 90 %": "Corundum 90%",
    "corundum brick 99 %": "Corundum 99%",
    "silica brick": "Silica",
    "magnesia brick": "Magnesia",
    "magnesia-chrome brick": "Magnesite Chrome",
    "silicon carbide brick 70 %": "SIC 70%",
    "silicon carbide brick 90 %": "SIC 90%",
    "zircon brick": "Zircon",
    "insulating brick L1260": "L1260",
    "insulating brick L1400": "L1400",
    "insulating brick L1540": "L1540",
    "insulating brick L1760": "L1760",
}
EN_12524 = {
    "bronze": "Metals, bronze",
    "steel, building use": "Metals, steel",
    "aluminium alloy, building use": "Metals, aluminium alloys",
    "concrete 2400 kg/m3": "Concrete, high density",
    "reinforced concrete, 1 % steel": "Concrete, reinforced with 1% steel",
    "reinforced concrete, 2 % steel": "Concrete, reinforced with 2% steel",
    "gypsum plasterboard": "Gypsum, plasterboard",
    "gypsum plaster 1300 kg/m3": "Plasters and renders, gypsum plastering, 1300 kg/m^3",
    "lime and sand render": "Plasters and renders, lime sand",
    "sandstone": "Stone, sandstone (silica)",
    "granite": "Stone, granite",
    "limestone, semi-hard": "Stone, limestone, semi-hard",
    "marble": "Stone, marble",
    "basalt": "Stone, basalt",
    "slate": "Stone, slate",
    "ceramic tile": "Tiles, ceramic or porcelain",
    "clay roof tile": "Tiles, clay",
    "timber 500 kg/m3": "Timber, 500 kg/m^3",
    "timber 700 kg/m3": "Timber, 700 kg/m^3",
    "plywood 500 kg/m3": "Wood, plywood 500 kg/m^3",
    "OSB": "Wood, oriented strand board",
    "particleboard 600 kg/m3": "Wood, particleboard, 600 kg/m^3",
    "cement-bonded particleboard": "Wood, cement-bonded particleboard",
    "wood fibreboard 250 kg/m3": "Wood, fibreboard, 250 kg/m^3",
    "cork board": "Floor covering, underlay, cork",
    "asphalt": "Asphalt",
    "bitumen": "Bitumen, pure",
    "clay or silt": "Solids, clay or silt",
    "sand and gravel": "Solids, sand and gravel",
    "crystalline rock": "Stone, natural, crystalline rock",
    "sedimentary rock": "Stone, natural, sedimentary rock",
    "soda-lime glass": "Glass, soda lime",
    "snow, fresh": "Water, snow, freshly fallen (<30 mm)",
    "snow, slightly compacted": "Water, snow, slightly compacted (70 mm to 100 mm)",
    "snow, compacted": "Water, snow, compacted (<200 mm)",
    "PE-HD": "Plastics, polyethylene / polythene, high density",
    "PE-LD": "Plastics, polyethylene / polythene, low density",
    "PP": "Plastics, polypropylene",
    "PVC, rigid": "Plastics, Polyvinylchloride (PVC)",
    "PTFE": "Plastics, polytetrafluoroethylene (PTFE)",
    "PA 6": "Plastics, polyamide (nylon)",
    "PA 66, 25 % glass fibre": "Plastics, polyamide 6.6 with 25% glass fibre",
    "PMMA": "Plastics, polymethylmethacrylate (PMMA)",
    "PC": "Plastics, polycarbonates",
    "PS": "Plastics, polystyrene",
    "POM": "Plastics, polyacetate",
    "epoxy resin": "Plastics, epoxy resin",
    "phenolic resin": "Plastics, phenolic resin",
    "polyester resin": "Plastics, polyester resin",
    "polyurethane, solid": "Plastics, polyurethane (PU)",
    "silicone, pure": "Sealant, silicone, pure",
    "silicone, filled": "Sealant, silicone, filled",
    "natural rubber": "Rubber, natural",
    "EPDM": "Rubber, ethylene propylene diene monomer (EPDM)",
    "neoprene": "Rubber, neoprene (polychloroprene)",
    "foam rubber": "Rubber, foam rubber",
}
ASHRAE_2013 = {
    "glass wool 12 kg/m3": "Glass-fiber batts, 90 mm",
    "mineral wool 32 kg/m3": "Mineral wool, felted, 32 kg/m^3",
    "EPS 20 kg/m3": "Expanded polystyrene, molded beads",
    "PUR foam 40 kg/m3": "Spray-applied Polyurethane foam, 40 kg/m^3",
    "cellular glass 130 kg/m3": "Cellular glass",
    "vermiculite, loose 120 kg/m3": "Loose fill, Vermiculite, exfoliated, 120 kg/m^3",
    "perlite, loose 50 kg/m3": "Loose fill, Perlite, expanded, 50 kg/m^3",
    "cellulose, loose 42 kg/m3": "Loose fill, Cellulosic",
    "aerated concrete 615 kg/m3, oven dry": "Concrete, Aerated concrete (oven-dried)",
    "lightweight aggregate concrete 1280 kg/m3": (
        "Concrete, Expanded shale, clay, or slate; expanded slags; cinders; pumice; scoria; 1280 kg/m^3"
    ),
    "clay brick 1600 kg/m3": "Brick, fired clay, 1600 kg/m^3",
    "clay brick 1920 kg/m3": "Brick, fired clay, 1920 kg/m^3",
}


def at(name, key, T):
    T = np.asarray(T, dtype=float)
    return np.broadcast_to(LIBRARY[name].properties()[key].to_law()(T=T), T.shape)


def inside(name, key, n=61):
    """Temperatures over the property's own range, between its rows too."""
    own = LIBRARY[name].properties()[key]
    rows, _ = own.rows()
    low, high = (rows[0], rows[-1]) if rows.size else LIBRARY[name].range_of(key)
    return np.linspace(low, high, n)


def _within(T, low, high):
    return np.clip(T, low - 0.01, high + 0.01) == T


# one function per source: temperatures, expected values, relative tolerance


def ho(name, key):
    T, k = ThermalConductivitySolid(CASRN=ELEMENTS[name][0]).tabular_data["Ho (1972)"]
    low, high = inside(name, key, 2)
    T, k = np.array(T), np.array(k)
    keep = _within(T, low, high)
    return T[keep], k[keep], 1e-5  # every row of it is ours; temperatures rounded to 0.001 K


def janaf(name, key):
    cas, molar = COMPOUNDS[name]
    T, c = HeatCapacitySolid(CASRN=cas, MW=molar).tabular_data["JANAF"]
    low, high = inside(name, key, 2)
    T, c = np.array(T), 1000.0 * np.array(c) / molar
    keep = _within(T, low, high)
    return T[keep], c[keep], 0.01  # where we keep every second row, a straight line errs by less than 1 %


def perry(name, key):
    cas, molar = COMPOUNDS[name]
    carrier = HeatCapacitySolid(CASRN=cas, MW=molar)
    T = inside(name, key)
    return T, np.array([1000.0 * carrier.calculate(t, "PERRY151") / molar for t in T]), 0.01  # straight lines


def crc(name, key):
    cas, molar = COMPOUNDS[name]
    return 298.15, molar / 1000.0 / rho_data_CRC_inorg_s_const.loc[cas, "Vm"], 2e-3  # printed to 3 digits


def en_12524(name, key):
    density, k, c = building_materials[EN_12524[name]]
    return 293.15, {"conductivity": k, "density": density, "specific_heat": c}[key], 1e-12


def ashrae(name, key):
    entry = ASHRAE_2013[name]
    return (
        293.15,
        {"conductivity": ASHRAE_k(entry), "density": ASHRAE[entry][0], "specific_heat": ASHRAE[entry][1]}[key],
        1e-12,
    )


VDI_T = np.array([400.0, 600.0, 800.0, 1000.0, 1200.0]) + ZERO


def vdi(name, key):
    density, k, mean_c = refractories[BRICKS[name]]
    return {
        "conductivity": (VDI_T, k, 1e-12),
        "density": (293.15, density, 1e-12),
        "specific_heat": (VDI_T, mean_c, 4e-3),
    }[key]


def fluid(name, key):
    T = inside(name, key)
    symbol = {"conductivity": "L", "density": "D", "specific_heat": "C"}[key]
    fluid = FLUIDS[name]
    pressure = 3e5 if fluid.startswith("INCOMP") else 101325.0
    return T, np.array([PropsSI(symbol, "T", t, "P", pressure, fluid) for t in T]), 2e-3
    # (dT/T)^2/4 < 1.4e-3 for a gas density ~ 1/T on 50 K rows at 400 degC and above, less elsewhere


SOURCES = {
    "Ho, Powell and Liley": ho,
    "NIST-JANAF": janaf,
    "Perry's": perry,
    "CRC Handbook": crc,
    "DIN EN 12524": en_12524,
    "ASHRAE Handbook Fundamentals 2013": ashrae,
    "VDI Heat Atlas": vdi,
    "Huber": fluid,
    "IAPWS-95": fluid,
    "Lemmon": fluid,
    "Tegeler": fluid,
    "Span": fluid,
    "Hands": fluid,
    "Ortiz Vega": fluid,
    "Melinder": fluid,
    "Choi and Okos": fluid,
}

PUBLISHED = [
    (name, key)
    for name in LIBRARY
    for key in PROPERTIES
    if LIBRARY[name].source_of(key)[1] in ("published", "published, extended")
]


@pytest.mark.parametrize(("name", "key"), PUBLISHED, ids=lambda part: part)
def test_published_value_agrees_with_a_second_carrier(name, key):
    text, _ = LIBRARY[name].source_of(key)
    carriers = [carrier for start, carrier in SOURCES.items() if text.startswith(start)]
    assert len(carriers) == 1, f"no carrier of {text!r} is known: the property may not be called published"
    T, expected, rtol = carriers[0](name, key)
    found = at(name, key, T)
    if carriers[0] is vdi and key == "specific_heat":
        found = mean_from_20_degc(name, T)
    np.testing.assert_allclose(found, expected, rtol=rtol)


def mean_from_20_degc(name, T):
    """Mean specific heat from 20 degC to each T, by the trapezoidal rule on 1 K."""
    grid = np.arange(293.15, T[-1] + 0.5)
    c = at(name, "specific_heat", grid)
    heat = np.concatenate([[0.0], np.cumsum(0.5 * (c[1:] + c[:-1]))])
    return np.interp(T, grid, heat) / (T - 293.15)


def test_the_brick_table_states_means_not_true_values():
    """Magnesia brick is nearly pure MgO: its true c is that of NIST-JANAF less some per cent, above the mean."""
    T, expected, _ = janaf("magnesium oxide, dense", "specific_heat")
    keep = (T >= 500.0) & (T <= 1400.0)
    np.testing.assert_allclose(at("magnesia brick", "specific_heat", T[keep]), expected[keep], rtol=0.07)
    assert np.all(refractories["Magnesia"][2][0] < 0.9 * np.interp(VDI_T[0], T, expected))


# foods: the composition in the source line must give the numbers in the table

PARTS = {
    "water": "FoodWater",
    "protein": "FoodProtein",
    "fat": "FoodFat",
    "carbohydrate": "FoodCarbohydrate",
    "fibre": "FoodFiber",
    "ash": "FoodAsh",
}
MIXED = [name for name in LIBRARY if "components mixed" in LIBRARY[name].source_of("conductivity")[0]]


def component(symbol, part, T):
    return np.array([PropsSI(symbol, "T", t, "P", 3e5, f"INCOMP::{PARTS[part]}") for t in T])


@pytest.mark.parametrize("name", MIXED)
def test_food_is_the_mixture_that_its_source_line_states(name):
    """Choi and Okos 1986, as in the ASHRAE Handbook Refrigeration: c and 1/rho by mass fractions, k by volume."""
    shares = {
        part: float(x) / 100 for x, part in re.findall(r"([\d.]+) % ([a-z]+)", LIBRARY[name].source_of("density")[0])
    }
    assert len({LIBRARY[name].source_of(key) for key in PROPERTIES}) == 1  # one line, said three times
    assert set(shares) <= set(PARTS)
    assert sum(shares.values()) == pytest.approx(1.0, abs=3e-3)  # printed to 0.1 %, up to six parts
    T = inside(name, "density", 13)
    volume = {part: x / component("D", part, T) for part, x in shares.items()}
    whole = sum(volume.values())
    rtol = 3e-3  # the printed composition
    np.testing.assert_allclose(at(name, "density", T), sum(shares.values()) / whole, rtol=rtol)
    np.testing.assert_allclose(
        at(name, "conductivity", T), sum(v * component("L", part, T) for part, v in volume.items()) / whole, rtol=rtol
    )
    np.testing.assert_allclose(
        at(name, "specific_heat", T),
        sum(x * component("C", part, T) for part, x in shares.items()) / sum(shares.values()),
        rtol=rtol,
    )


def test_foods_lie_where_measured_ones_do():
    """Textbook figures, common practice, no source: lean meat 0.4-0.5 W/(m K), fat 0.15-0.25, c rises with water."""
    assert 0.40 <= at("lean beef", "conductivity", 293.15) <= 0.52
    assert 0.15 <= at("butter", "conductivity", 293.15) <= 0.26
    wet = sorted(
        MIXED, key=lambda name: float(re.search(r"([\d.]+) % water", LIBRARY[name].source_of("density")[0])[1])
    )
    c = [float(at(name, "specific_heat", 293.15)) for name in wet]
    assert c[0] < 2600 < 3900 < c[-1] < 4184
