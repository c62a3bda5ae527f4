"""Diversity: handbook values as published, figures of real homes, and laws held against readings."""

import numpy as np
import pytest
from scipy.stats import norm

from loadsum.peak import handbook
from loadsum.peak.diversity import diversity, maximum_by_number
from loadsum.study.loadtocome import DiversityTable, Rusck, Velander
from tests.peak.samples import home_blocks, one_block, reference

PUBLISHED = reference("diversity")


def expected(name):
    return PUBLISHED[name]["expected"]


# Gonen ch. 2: inputs read in an open textbook companion (source_read), outputs computed from the formula.
def test_connected_load_of_six_houses_agrees_with_gonen_example_2_3():
    assert handbook.diversified_kw(9.0, 6, 0.65, 1.1) == pytest.approx(expected("gonen_ex2_3_kW"), rel=1e-9)


def test_diversity_of_two_loads_agrees_with_gonen_example_2_5():
    own = [2000.0, 2000.0]
    assert handbook.diversity_factor(3000.0, own) == pytest.approx(expected("gonen_ex2_5_Fd"), rel=1e-9)
    assert handbook.coincidence_factor(3000.0, own) == pytest.approx(expected("gonen_ex2_5_Fc"), rel=1e-9)
    assert handbook.load_diversity_kw(3000.0, own) == expected("gonen_ex2_5_LD_kW")


def test_load_factors_agree_with_gonen_examples_2_7_to_2_9():
    assert handbook.load_factor(1e7, 1.0, 8760.0) == pytest.approx(expected("gonen_ex2_7_Pav"), rel=1e-9)
    assert handbook.load_factor(1e7, 3500.0, 8760.0) == pytest.approx(expected("gonen_ex2_7_Fld"), rel=1e-9)
    assert handbook.load_factor(1e7 + 100 * 8760, 3600.0, 8760.0) == pytest.approx(
        expected("gonen_ex2_8_Fld"), rel=1e-9
    )
    factor = handbook.load_factor(5.61e6, 2000.0, 8760.0)
    assert factor == pytest.approx(expected("gonen_ex2_9_Fld"), rel=1e-9)
    losses = handbook.loss_factor_from(factor)
    assert losses == pytest.approx(expected("gonen_ex2_9_Fls"), rel=1e-9)
    assert losses * 100.0 * 8760.0 == pytest.approx(expected("gonen_ex2_9_AEL_kWh"), rel=1e-9)


def test_appliances_of_houses_agree_with_gonens_residential_example():
    each = [1.6, 0.8, 0.066, 0.61]
    share = [1.0] * 4
    assert handbook.appliance_kw(6, each, share, share) == pytest.approx(expected("gonen_ex2_11_Mddt6_kW"), rel=1e-9)
    many = [1.2, 0.53, 0.044, 0.52]
    assert handbook.appliance_kw(900, many, share, share) == pytest.approx(expected("gonen_ex2_11_Mdf900_kW"), rel=1e-9)
    for name, hourly in (
        ("gonen_ex2_11_4pm", [0.38, 0.24, 0.9, 0.32]),
        ("gonen_ex2_11_5pm", [0.30, 0.80, 0.9, 0.70]),
        ("gonen_ex2_11_6pm", [0.22, 1.0, 0.9, 0.92]),
    ):
        assert handbook.appliance_kw(6, each, share, hourly) == pytest.approx(expected(name), rel=1e-9)


# Kersting ch. 2: maximum diversified demand 16.16 kW source_read; individual maxima from memory.
def test_four_customers_agree_with_kersting():
    values = expected("kersting_4cust")
    own = values["maxima"]
    assert handbook.diversity_factor(16.16, own) == pytest.approx(values["DF"], rel=1e-9)
    assert handbook.coincidence_factor(16.16, own) == pytest.approx(values["CF"], rel=1e-9)
    assert handbook.load_diversity_kw(16.16, own) == pytest.approx(values["load_diversity"], rel=1e-9)
    assert handbook.utilisation_factor(16.16 / 0.9, 15.0) == pytest.approx(values["UF_15kVA_pf0.9"], rel=1e-9)


# Kersting ch. 2, diversity-factor table: from memory; used as a table that a user would supply, never a default.
def test_a_users_diversity_table_divides_the_sum_of_maxima_as_in_kerstings_transformer():
    table = expected("kersting_df_table")
    values = expected("kersting_T1")
    factor = handbook.table_factor(5, range(1, 71), table)
    assert factor == values["DF"]
    assert sum(values["kW"]) / factor == pytest.approx(values["diversified_kW"], rel=1e-9)
    loading = handbook.utilisation_factor(values["diversified_kW"] / 0.9, 25.0)
    assert 100 * loading == pytest.approx(values["loading_25kVA_pct"], rel=1e-9)
    assert handbook.table_factor(90, range(1, 71), table) == 3.2


# French NF C 14-100 as printed in an installation handbook (source_read).
def test_a_users_coincidence_table_multiplies_as_in_the_apartment_example():
    values = expected("nfc14_100")
    smallest = [2, 5, 10, 15, 20, 25, 30, 35, 40, 50]
    factor = [1.0, 0.78, 0.63, 0.53, 0.49, 0.46, 0.44, 0.42, 0.41, 0.40]
    assert handbook.table_factor(25, smallest, factor) == values["ks25"]
    assert 25 * 6 * handbook.table_factor(25, smallest, factor) == pytest.approx(values["kVA"])
    assert (36 + 24 + 30) * handbook.table_factor(14, smallest, factor) == pytest.approx(values["third_floor_kVA"])
    assert np.isnan(handbook.table_factor(1, smallest, factor))


# Rusck 1956: form of the law from memory, values computed from it.
@pytest.mark.parametrize("customers", [1, 4, 10, 25, 100])
def test_the_square_root_law_agrees_with_its_formula(customers):
    assert handbook.rusck_coincidence(customers, 0.2) == pytest.approx(expected("rusck")[str(customers)], abs=1e-12)


# Velander coefficients as remembered (memory, not verified): a check of arithmetic, not a default.
def test_the_two_term_law_agrees_with_its_formula():
    values = expected("velander")
    assert handbook.velander_kw(values["W_kWh"], 0.00033, 0.05) == pytest.approx(values["P_kW"], rel=1e-12)


# Computed from the normal law of a sum; both laws follow from it exactly.
def test_square_root_and_two_term_law_are_the_normal_law():
    v = expected("normal_law_of_rusck_and_velander")
    mean, spread, z, n = v["mu"], v["sigma"], v["z95"], v["N"]
    one = handbook.normal_law_kw(1, mean, spread, z)
    assert one == pytest.approx(v["P1"], rel=1e-9)
    assert handbook.normal_law_kw(n, mean, spread, z) == pytest.approx(v["P_clt"], rel=1e-9)
    assert n * one * handbook.rusck_coincidence(n, v["c_inf"]) == pytest.approx(v["P_rusck"], rel=1e-9)
    k1, k2 = v["velander_k1 (E=5000)"], v["velander_k2"]
    assert handbook.velander_kw(n * 5000.0, k1, k2) == pytest.approx(v["P_velander"], rel=1e-9)
    for correlation in (0.05, 0.1, 0.3):
        law = handbook.normal_law_kw(n, mean, spread, z, correlation)
        assert law == pytest.approx(v[f"rho{correlation}"], rel=1e-9)
    assert handbook.normal_law_kw(n, mean, spread, z, 1.0) == pytest.approx(v["comonotone"], rel=1e-9)


# Var = N s^2 (1 + (N-1) rho) (computed_from_formula).
@pytest.mark.parametrize("correlation", ["0", "0.02", "0.05", "0.1", "0.3", "1"])
def test_correlation_raises_the_risk_of_twenty_customers_as_published(correlation):
    value = reference("peak")["equicorr"]["expected"][correlation]
    spread = handbook.normal_law_kw(20, 1.5, 1.2, 1.0, float(correlation)) - 30.0
    assert spread == pytest.approx(float(value["sd"]), rel=1e-8)
    assert norm.sf(45.0, 30.0, spread) == pytest.approx(float(value["P(S>45)"]), rel=1e-6)


# 1 - (1 - 1/T)^n (computed_from_formula).
@pytest.mark.parametrize("case", ["T=2,n=1", "T=10,n=1", "T=10,n=10", "T=2,n=10", "T=20,n=10", "T=50,n=40"])
def test_a_level_of_one_year_in_many_is_passed_within_years_as_published(case):
    one_in, years = (int(part.split("=")[1]) for part in case.split(","))
    published = float(reference("peak")["return"]["expected"][case])
    assert handbook.within_years(one_in, years) == pytest.approx(published, abs=1e-10)


def figures(blocks, **more):
    return diversity(blocks, interval_min=60, power_factor=0.95, rng=np.random.default_rng(1), **more)


def test_figures_of_a_small_group_are_those_worked_by_hand():
    kw = np.zeros((3, 2, 24))
    kw[0, 0, 7], kw[0, 1, 18] = 5.0, 2.0
    kw[1, 1, 18] = 4.0
    kw[2, :, :] = 1.0
    found = figures([one_block(kw)], rating_kva=10.0)
    assert (found.maximum_kw, found.sum_of_maxima_kw, found.load_diversity_kw) == (7.0, 10.0, 3.0)
    assert found.coincidence_factor == pytest.approx(0.7)
    assert found.diversity_factor == pytest.approx(1 / 0.7)
    assert found.admd_kw == pytest.approx(7.0 / 3.0)
    assert found.load_factor == pytest.approx((48 + 11) / 48 / 7.0)
    assert found.loss_factor == pytest.approx((46 * 1 + 36 + 49) / 48 / 49)
    assert found.utilisation_factor == pytest.approx(7.0 / 0.95 / 10.0)
    assert found.at_maximum_kw.tolist() == [2.0, 4.0, 1.0]
    assert found.contribution == pytest.approx([0.4, 1.0, 1.0])
    weighted = found.contribution @ [5.0, 4.0, 1.0] / 10.0
    assert weighted == pytest.approx(found.coincidence_factor)


def test_figures_are_limited_to_intervals_in_which_every_customer_has_a_reading():
    kw = np.ones((2, 4, 24))
    kw[0, 0, 5] = np.nan
    kw[1, 0, 5] = 99.0
    found = figures([one_block(kw)])
    assert (found.maximum_kw, found.period_h) == (2.0, 95.0)
    assert figures([one_block(np.full((2, 4, 24), np.nan))]) is None


def test_factors_of_real_homes_obey_the_inequalities_between_them():
    found = figures(home_blocks())
    print(f"17 homes: F_c {found.coincidence_factor:.3f}, ADMD {found.admd_kw:.2f} kW, F_LD {found.load_factor:.3f}")
    assert 0.0 < found.coincidence_factor < 1.0
    assert found.load_factor**2 <= found.loss_factor <= found.load_factor
    per_customer = found.growth.expected_kw / found.growth.customers
    assert np.all(np.diff(per_customer) < 0.0)
    assert np.all(found.growth.q90_kw >= found.growth.expected_kw)
    assert found.growth.expected_kw[-1] == pytest.approx(found.maximum_kw)
    assert found.growth.expected_kw[0] * 17 == pytest.approx(found.sum_of_maxima_kw)


def test_groups_drawn_agree_with_every_pair_of_homes():
    kw = np.concatenate([block.kw.reshape(17, -1) for block in home_blocks()], axis=1)[:8]
    drawn = maximum_by_number(kw, np.random.default_rng(0), draws=2000)
    pairs = [(kw[a] + kw[b]).max() for a in range(8) for b in range(a)]
    two = drawn.customers.tolist().index(2)
    assert drawn.expected_kw[two] == pytest.approx(np.mean(pairs), rel=0.01)


def test_laws_and_tables_of_the_user_stand_beside_with_how_far_they_are_off():
    found = figures(
        home_blocks(),
        rusck=Rusck(coincidence_of_many=0.2, source="stated for this test"),
        velander=Velander(k1_kw_per_kwh=0.0003, k2_kw_per_sqrt_kwh=0.03),
        tables=[
            DiversityTable(name="t1", customers=(2, 5), factor=(1.0, 0.5), kind="coincidence factor"),
            DiversityTable(name="t2", customers=(1, 5), factor=(1.0, 2.0), kind="diversity factor"),
        ],
    )
    root, two_term, multiplied, divided = found.laws
    assert root.kw[0] == pytest.approx(found.growth.expected_kw[0])
    assert root.over_expected == pytest.approx(root.kw / found.growth.expected_kw)
    assert root.source == "stated for this test"
    assert two_term.source == "not traced to a source"
    assert np.isnan(multiplied.kw[0])
    assert multiplied.kw[-1] == divided.kw[-1] == pytest.approx(0.5 * found.sum_of_maxima_kw)
    print("square-root law over expected maximum:", root.over_expected.round(2))


def test_no_law_is_drawn_without_the_users_own_figures():
    assert figures(home_blocks()[:1], rusck=Rusck(), velander=Velander()).laws == ()
