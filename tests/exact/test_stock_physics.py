"""Library values against the formulas of the Eurocodes and against the physics that every stock must obey."""

import numpy as np
import pytest
from chemicals.elements import periodic_table
from chemicals.volume import rho_data_CRC_inorg_s_const
from CoolProp.CoolProp import PropsSI
from thermo.heat_capacity import HeatCapacitySolid

from fem.stock.models import PROPERTIES, library

LIBRARY = library()
ZERO = 273.15

METALS = {
    "aluminium, pure": "Al",
    "copper, pure": "Cu",
    "nickel, pure": "Ni",
    "titanium, pure": "Ti",
    "zinc, pure": "Zn",
    "lead, pure": "Pb",
    "magnesium, pure": "Mg",
    "silver, pure": "Ag",
    "tin, white": "Sn",
    "tungsten": "W",
    "molybdenum": "Mo",
    "silicon": "Si",
}


def at(name, key, T):
    T = np.asarray(T, dtype=float)
    return np.broadcast_to(LIBRARY[name].properties()[key].to_law()(T=T), T.shape)


# formulas of the Eurocodes, typed here a second time (formulas from memory of the standards)


def steel_c(t):
    """EN 1993-1-2:2005, 3.4.1.2."""
    return np.select(
        [t < 600, t < 735, t < 900],
        [
            425 + 0.773 * t - 1.69e-3 * t**2 + 2.22e-6 * t**3,
            666 + 13002 / (738 - np.minimum(t, 735)),
            545 + 17820 / (t - 731 + (t < 735) * 1e3),
        ],
        650.0,
    )


FORMULAS = {
    ("carbon steel", "conductivity"): (lambda t: np.where(t < 800, 54 - 0.0333 * t, 27.3), 20, 1200),
    ("carbon steel", "specific_heat"): (steel_c, 20, 1200),
    ("stainless steel", "conductivity"): (lambda t: 14.6 + 0.0127 * t, 20, 1200),
    ("stainless steel", "specific_heat"): (lambda t: 450 + 0.28 * t - 2.91e-4 * t**2 + 1.34e-7 * t**3, 20, 1200),
    ("aluminium alloy 3xxx or 6xxx", "conductivity"): (lambda t: 190 + 0.07 * t, 0, 500),
    ("aluminium alloy 5xxx or 7xxx", "conductivity"): (lambda t: 140 + 0.1 * t, 0, 500),
    ("aluminium alloy 3xxx or 6xxx", "specific_heat"): (lambda t: 903 + 0.41 * t, 0, 500),
    ("concrete, upper limit, dry", "conductivity"): (
        lambda t: 2 - 0.2451 * t / 100 + 0.0107 * (t / 100) ** 2,
        20,
        1200,
    ),
    ("concrete, lower limit, dry", "conductivity"): (
        lambda t: 1.36 - 0.136 * t / 100 + 0.0057 * (t / 100) ** 2,
        20,
        1200,
    ),
    ("concrete, lower limit, dry", "specific_heat"): (
        lambda t: np.select([t < 100, t < 200, t < 400], [900 + 0 * t, 900 + (t - 100), 1000 + (t - 200) / 2], 1100.0),
        20,
        1200,
    ),
    ("concrete, lower limit, dry", "density"): (
        lambda t: 2300 * np.interp(t, [20, 115, 200, 400, 1200], [1, 1, 0.98, 0.95, 0.88]),
        20,
        1200,
    ),
}


@pytest.mark.parametrize(("name", "key"), FORMULAS)
def test_table_follows_the_formula_to_a_tenth_of_a_per_cent(name, key):
    formula, low, high = FORMULAS[(name, key)]
    t = np.linspace(low, high, 100_001)
    if (name, key) == ("carbon steel", "conductivity"):
        t = t[(t < 800) | (t > 801)]  # the formula steps by 0.2 % at 800 degC; the table takes 1 K for it
    np.testing.assert_allclose(at(name, key, t + ZERO), formula(t), rtol=1e-3)


@pytest.mark.parametrize(
    ("key", "t", "value", "digits"),
    [
        ("specific_heat", 20, 439.8, 0.05), ("specific_heat", 100, 487.6, 0.5), ("specific_heat", 200, 529.8, 0.5),
        ("specific_heat", 400, 605.9, 0.6), ("specific_heat", 600, 760.2, 0.5), ("specific_heat", 700, 1008, 1.0),
        ("specific_heat", 735, 5000, 5), ("specific_heat", 800, 803, 0.9), ("specific_heat", 900, 650, 0.5),
        ("conductivity", 20, 53.3, 0.05), ("conductivity", 200, 47.3, 0.05), ("conductivity", 400, 40.7, 0.05),
        ("conductivity", 600, 34.0, 0.05), ("conductivity", 800, 27.3, 0.1),
    ],
)  # fmt: skip
def test_carbon_steel_has_the_values_of_en_1993_1_2(key, t, value, digits):
    """Values computed by hand from EN 1993-1-2:2005, 3.4.1; tolerance: their rounding, and 0.1 % between rows."""
    assert at("carbon steel", key, t + ZERO) == pytest.approx(value, abs=digits)


@pytest.mark.parametrize(
    ("name", "moisture", "peak"),
    [("1.5 % moisture", 0.015, 1470), ("3 % moisture", 0.03, 2020)],
)
@pytest.mark.parametrize("limit", ["lower", "upper"])
def test_moist_concrete_takes_up_the_heat_that_its_water_needs(limit, name, moisture, peak):
    """EN 1992-1-2:2004, 3.3.2: the peak stands for evaporation: its area is about moisture times latent heat."""
    moist, dry = f"concrete, {limit} limit, {name}", f"concrete, {limit} limit, dry"
    t = np.linspace(20, 1200, 200_001)
    surplus = at(moist, "specific_heat", t + ZERO) - at(dry, "specific_heat", t + ZERO)
    assert at(moist, "specific_heat", 108 + ZERO) == pytest.approx(peak)
    latent = PropsSI("H", "Q", 1, "T", 373.15, "Water") - PropsSI("H", "Q", 0, "T", 373.15, "Water")
    assert np.trapezoid(surplus, t) == pytest.approx(moisture * latent, rel=0.1)  # the standard rounds the peak


def test_softwood_takes_up_the_heat_that_its_water_needs():
    """EN 1995-1-2:2004, annex B, 12 % moisture: the steps at 99 and 120 degC stand for evaporation."""
    name, dry_density, moisture = "softwood in standard fire", 450.0, 0.12
    t = np.linspace(95, 125, 30_001)
    rho_c = at(name, "density", t + ZERO) * at(name, "specific_heat", t + ZERO)
    base = np.interp(t, t[[0, -1]], rho_c[[0, -1]])
    latent = PropsSI("H", "Q", 1, "T", 373.15, "Water") - PropsSI("H", "Q", 0, "T", 373.15, "Water")
    assert np.trapezoid(rho_c - base, t) == pytest.approx(moisture * dry_density * latent, rel=0.1)


def test_grey_iron_has_both_means_of_en_1561():
    t = np.linspace(20, 600, 5801)
    c = at("grey cast iron EN-GJL-250", "specific_heat", t + ZERO)
    assert c[t <= 200].mean() == pytest.approx(460, abs=0.5)
    assert c.mean() == pytest.approx(535, abs=0.5)


# remembered handbook values against other data


@pytest.mark.parametrize(
    ("name", "method", "T"),
    [("titanium, pure", "Fit 2023 alpha titanium", [300, 400, 600, 800, 1000])],
)
def test_remembered_heat_capacity_of_a_metal(name, method, T):
    """Against the fit that `thermo` carries; handbooks differ by up to 5 % (common practice, no source)."""
    element = periodic_table[METALS[name]]
    carrier = HeatCapacitySolid(CASRN=element.CAS, MW=element.MW)
    expected = [1000.0 * carrier.calculate(float(t), method) / element.MW for t in T]
    np.testing.assert_allclose(at(name, "specific_heat", T), expected, rtol=0.05)


def test_remembered_heat_capacity_of_fused_silica():
    """Against Perry, 8th ed., table 2-151, which starts at 523 K; each states 2 % at best."""
    carrier = HeatCapacitySolid(CASRN="7631-86-9", MW=60.0843)
    T = np.array([550.0, 600.0])
    expected = [1000.0 * carrier.calculate(t, "PERRY151") / 60.0843 for t in T]
    np.testing.assert_allclose(at("fused silica", "specific_heat", T), expected, rtol=0.04)


def test_engine_oil_has_the_figures_of_a_mineral_oil():
    """Mineral oils differ little: k 0.11-0.15 W/(m K), c about 1.7 + 0.004 t kJ/(kg K) (common practice, no source)."""
    t = np.linspace(0, 140, 15)
    k, c = at("engine oil, at rest", "conductivity", t + ZERO), at("engine oil, at rest", "specific_heat", t + ZERO)
    assert np.all((k > 0.11) & (k < 0.15))
    np.testing.assert_allclose(c, 1750 + 4.2 * t, rtol=0.06)


# physics that every stock must obey


@pytest.mark.parametrize("name", METALS)
def test_molar_heat_capacity_of_metals_is_three_r(name):
    """Dulong and Petit at 350 K, 15 %; not silicon, whose Debye temperature of 645 K is far above."""
    molar = periodic_table[METALS[name]].MW
    ratio = float(at(name, "specific_heat", 350.0)) * molar / 1000.0 / (3 * 8.314462618)
    if name == "silicon":
        assert 0.7 < ratio < 0.9
    else:
        assert ratio == pytest.approx(1.0, abs=0.15)


RESISTIVITY = {  # 1e-8 ohm m at 293 K: CRC Handbook of Chemistry and Physics, from memory
    "copper, pure": 1.678,
    "silver, pure": 1.587,
    "aluminium, pure": 2.65,
    "nickel, pure": 6.93,
    "zinc, pure": 5.9,
    "magnesium, pure": 4.39,
    "lead, pure": 20.8,
    "tin, white": 11.5,
    "molybdenum": 5.34,
}


@pytest.mark.parametrize("name", RESISTIVITY)
def test_conductivity_of_pure_metals_obeys_wiedemann_and_franz(name):
    """L = k rho/T = 2.44e-8 W ohm/K2; measured ones scatter by 15 % (Kittel). Not tungsten, titanium: lattice."""
    lorenz = float(at(name, "conductivity", 293.0)) * RESISTIVITY[name] * 1e-8 / 293.0
    assert lorenz == pytest.approx(2.44e-8, rel=0.15)


@pytest.mark.parametrize(
    ("name", "effusivity"),
    [
        ("copper, pure", 37000),
        ("carbon steel", 13400),
        ("stainless steel 304", 7700),
        ("concrete 2400 kg/m3", 2080),
        ("water, at rest", 1580),
        ("soda-lime glass", 1370),
        ("clay brick 1920 kg/m3", 1080),
        ("timber 500 kg/m3", 320),
    ],
)
def test_effusivity_is_the_usual_one(name, effusivity):
    """Square root of k rho c, W s^0.5/(m2 K); common practice, no source, so 10 %."""
    k, rho, c = (float(at(name, key, 293.15)) for key in PROPERTIES)
    assert (k * rho * c) ** 0.5 == pytest.approx(effusivity, rel=0.1)


@pytest.mark.parametrize("name", LIBRARY)
def test_diffusivity_and_heat_capacity_are_of_this_world(name):
    """Diffusivity 5e-8 to 2e-4 m2/s except of gases; rho c of dense solids 1e6 to 5e6 J/(m3 K); common practice."""
    stock = LIBRARY[name]
    low, high = stock.valid_range
    T = np.linspace(low, high, 401)
    rho, c = at(name, "density", T), at(name, "specific_heat", T)
    diffusivity = at(name, "conductivity", T) / (rho * c)
    if rho.max() < 10.0:
        assert stock.family == "fluids at rest"
        assert np.all((diffusivity > 4e-6) & (diffusivity < 1e-3))
        return
    floor = 1e-8 if name == "softwood in standard fire" else 5e-8  # its peak is the water's latent heat
    assert np.all((diffusivity > floor) & (diffusivity < 2e-4))
    usual = (
        float(rho[0] * c[0])
        if high < 293.15
        else float(at(name, "density", 293.15) * at(name, "specific_heat", 293.15))
    )
    if rho[0] > 1500:
        assert 1e6 < usual < 5e6
    assert usual < 5e6


FAMILY_BANDS = {  # at 20 degC or the top of the range: conductivity, density, specific heat; common practice, no source
    "metals": ((6, 450), (1700, 19400), (120, 1100)),
    "refractories": ((0.09, 30), (450, 4000), (450, 1050)),
    "insulation": ((0.012, 0.2), (10, 900), (700, 1750)),
    "building": ((0.09, 4), (350, 2900), (750, 1750)),
    "ground": ((0.3, 4), (900, 2900), (750, 3100)),
    "polymers": ((0.05, 0.8), (60, 2250), (850, 2250)),
    "glass and ceramics": ((1, 180), (1700, 6200), (400, 950)),
    "foods": ((0.05, 0.67), (250, 1150), (2000, 4150)),
    "fluids at rest": ((0.01, 0.65), (0.15, 1100), (500, 5300)),
    "ice and snow": ((0.04, 2.4), (90, 920), (1900, 2100)),
}


@pytest.mark.parametrize("name", LIBRARY)
def test_values_lie_in_the_band_of_their_family(name):
    """Catches a slip of the pen by a factor of ten in a value that no second carrier holds."""
    T = min(293.15, LIBRARY[name].valid_range[1])
    for key, (low, high) in zip(PROPERTIES, FAMILY_BANDS[LIBRARY[name].family], strict=True):
        assert low <= at(name, key, T) <= high, key


@pytest.mark.parametrize(
    ("name", "cas", "molar"),
    [
        ("alumina ceramic", "1344-28-1", 101.961),
        ("silicon carbide, sintered", "409-21-2", 40.096),
        ("aluminium nitride", "24304-00-5", 40.989),
        ("silicon nitride", "12033-89-5", 140.283),
    ],
)
def test_density_of_a_dense_ceramic_is_nearly_that_of_its_crystal(name, cas, molar):
    """CRC Handbook of Chemistry and Physics, 95th ed. 2014; dense ceramics keep below 5 % of pores."""
    crystal = molar / 1000.0 / rho_data_CRC_inorg_s_const.loc[cas, "Vm"]
    assert 0.95 * crystal <= at(name, "density", 293.15) <= 1.02 * crystal
