# SPDX-License-Identifier: GPL-3.0-or-later
"""The independent models and markers against the tables of data/reference (sources there)."""
import models
import numpy as np
import peer
from harness import close, equal, main, test
from philox import philox
from reference_data import table, values

# Half a unit in the last digit a table prints, relative, for values of three digits.
THREE_DIGITS = 6e-3


def centre(marker, length):
    """Mean of the central 2×2 cells of a two-orbital flake."""
    cells = (marker[0::2] + marker[1::2]).reshape(length, length)
    middle = slice(length // 2 - 1, length // 2 + 1)
    return cells[middle, middle].mean(), cells


def open_marker(hamiltonian, sites, area=1.0, electrons=None):
    states, _ = peer.occupied_states(hamiltonian, electrons=electrons)
    return peer.local_chern(states, sites["x"], sites["y"], area)


@test
def qwz_signs_agree_three_ways():
    for row in table("qwz_signs.csv"):
        links = models.chern_by_links(
            lambda a, b, m=row["m"]: models.qi_wu_zhang_bloch(a, b, m), 1, 16)
        close(links, row["chern"], 1e-9, "link variables at m = %g" % row["m"])
        torus, sites = models.qi_wu_zhang(8, 8, row["m"], periodic=True)
        states, _ = peer.occupied_states(torus)
        close(peer.bott(states, sites["x"], sites["y"], [[8, 0], [0, 8]]), row["bott"], 1e-9, "Bott")
        if row["marker_centre"] is not None:
            flake, sites = models.qi_wu_zhang(16, 16, row["m"])
            close(centre(open_marker(flake, sites), 16)[0], row["marker_centre"], 1e-6, "marker")


@test
def qwz_flakes_converge_as_tabled():
    for row in table("qwz_convergence.csv"):
        length = int(row["L"])
        marker = open_marker(*models.qi_wu_zhang(length, length))
        middle, cells = centre(marker, length)
        close((1.0 - middle) / row["deficit"], 1.0, THREE_DIGITS, "deficit at L = %d" % length)
        close(cells.min(), row["edge_minimum"], 6e-3, "edge at L = %d" % length)
        close(marker.sum(), 0.0, 1e-11, "trace of a commutator")


@test
def qwz_bott_with_and_without_logarithm():
    for row in table("qwz_bott.csv"):
        length = int(row["L"])
        hamiltonian, sites = models.qi_wu_zhang(length, length, periodic=True)
        states, _ = peer.occupied_states(hamiltonian)
        place = states, sites["x"], sites["y"], [[length, 0], [0, length]]
        close(peer.bott(*place), 1.0, 1e-10, "Bott")
        close(peer.bott_without_log(*place), row["without_log"], 6e-7, "without the logarithm")
        u, v = peer.bott_matrices(*place)
        moduli = np.abs(np.linalg.eigvals(v @ u @ v.conj().T @ u.conj().T))
        close(moduli.min(), row["smallest_modulus"], 6e-5, "smallest modulus")


@test
def haldane_hexagons_as_tabled():
    for row in table("haldane_hexagon.csv"):
        for t2, key in ((0.1, "marker_t2_0.1"), (0.2, "marker_t2_0.2"), (1 / 3, "marker_t2_third")):
            hamiltonian, sites, middle = models.haldane_hexagon(int(row["n"]), t2=t2)
            equal(len(sites), int(row["sites"]), "sites")
            marker = open_marker(hamiltonian, sites, np.sqrt(3.0) / 2.0)
            near = np.hypot(sites["x"] - middle[0], sites["y"] - middle[1]) < 0.6
            equal(int(near.sum()), 6, "sites of the central hexagon")
            close(2.0 * marker[near].mean(), row[key], 6e-7, "central marker")
            if t2 == 0.2:
                _, energies = peer.occupied_states(hamiltonian)
                half = len(sites) // 2
                close(energies[half] - energies[half - 1], row["level_gap"], 6e-6, "level gap")


@test
def haldane_bott_and_links_follow_the_lobe():
    # |mass| < 3√3 t2 |sin φ|: F. D. M. Haldane, PRL 61, 2015 (1988), value recalled from memory.
    edge = 3.0 * np.sqrt(3.0) * 0.2
    for phi, mass, chern in ((90, 0.0, 1), (90, 0.9 * edge, 1), (90, 1.1 * edge, 0),
                             (-90, 0.0, -1), (30, 0.4 * edge, 1), (30, 0.6 * edge, 0)):
        angle = np.radians(phi)
        links = models.chern_by_links(
            lambda a, b, p=angle, m=mass: models.haldane_bloch(a, b, phi=p, mass=m), 1)
        close(links, chern, 1e-9, "link variables")
        hamiltonian, sites = models.haldane(9, 9, phi=angle, mass=mass, periodic=True)
        states, _ = peer.occupied_states(hamiltonian, electrons=81)
        torus = 9 * models.HONEYCOMB
        close(peer.bott(states, sites["x"], sites["y"], torus), chern, 1e-9, "Bott")


def plane_wave_defect(torus, sites, bloch, n1, n2):
    """Largest entry of H (e^{ik·R} ⊗ 1) − (e^{ik·R} ⊗ 1) H(k) over all k of the torus."""
    worst = 0.0
    orbitals = sites["orbital"].max() + 1
    for a in range(n1):
        for b in range(n2):
            k1, k2 = 2 * np.pi * a / n1, 2 * np.pi * b / n2
            phase = np.exp(1j * (k1 * sites["cell_i"] + k2 * sites["cell_j"]))
            wave = phase[:, None] * (sites["orbital"][:, None] == np.arange(orbitals))
            worst = max(worst, np.abs(torus @ wave - wave @ bloch(k1, k2)).max())
    return worst


@test
def tori_act_on_plane_waves_as_the_bloch_matrix():
    torus, sites = models.haldane(6, 4, phi=0.7, mass=0.3, periodic=True)
    close(plane_wave_defect(torus, sites,
                            lambda a, b: models.haldane_bloch(a, b, phi=0.7, mass=0.3), 6, 4),
          0.0, 1e-12, "haldane")
    torus, sites = models.qi_wu_zhang(5, 4, 0.7, periodic=True)
    close(plane_wave_defect(torus, sites, lambda a, b: models.qi_wu_zhang_bloch(a, b, 0.7), 5, 4),
          0.0, 1e-12, "qi_wu_zhang")


@test
def hofstadter_gaps_carry_the_published_integers():
    for row in table("hofstadter_chern.csv"):
        p, q, r = int(row["p"]), int(row["q"]), int(row["r"])
        links = models.chern_by_links(
            lambda a, b, p=p, q=q: models.hofstadter_bloch(a, b, p, q), r, 18)
        close(links, row["chern"], 1e-6, "gap %d of %d/%d" % (r, p, q))


@test
def hofstadter_torus_and_flake_agree_with_the_integers():
    for q in (3, 5):
        wanted = [row for row in table("hofstadter_chern.csv") if row["p"] == 1 and row["q"] == q]
        torus, sites = models.hofstadter(15, 15, 1, q, periodic=True)
        for row in wanted:
            states, _ = peer.occupied_states(torus, electrons=int(row["r"]) * 225 // q)
            index = peer.bott(states, sites["x"], sites["y"], [[15, 0], [0, 15]])
            close(index, row["chern"], 1e-9, "Bott of gap %d of 1/%d" % (row["r"], q))


@test
def hofstadter_band_edges_are_exact():
    edges = values("hofstadter_edges.csv")
    for q, gap in ((3, "third_gap"), (4, "quarter_gap")):
        grid = 2 * np.pi * np.arange(24) / 24
        bands = np.array([np.linalg.eigvalsh(models.hofstadter_bloch(a, b / q, 1, q))
                          for a in grid for b in grid])
        close(bands[:, 1].min() - bands[:, 0].max(), edges[gap]["value"], 1e-9, gap)
        if q == 3:
            close(bands.min(), edges["third_lowest"]["value"], 1e-9, "lowest level")


@test
def golden_disordered_sample():
    potential = 2.0 * np.array([(philox((i, 0, 0, 0), (1, 0))[0] + 0.5) / 2.0**32 - 0.5
                                for i in range(64)])
    torus, sites = models.qi_wu_zhang(8, 8, -1.0, periodic=True, potential=potential)
    states, energies = peer.occupied_states(torus)
    found = {"V_0": potential[0], "V_1": potential[1], "V_2": potential[2],
             "sum_V": potential.sum(), "torus_occupied": states.shape[1],
             "torus_highest_occupied": energies[63], "torus_lowest_empty": energies[64],
             "torus_bott": peer.bott(states, sites["x"], sites["y"], [[8, 0], [0, 8]])}
    flake, sites = models.qi_wu_zhang(8, 8, -1.0, potential=potential)
    states, _ = peer.occupied_states(flake)
    middle, cells = centre(peer.local_chern(states, sites["x"], sites["y"], 1.0), 8)
    found.update(open_occupied=states.shape[1], open_marker_cell_4_4=cells[4, 4],
                 open_marker_mean_3_4=middle)
    wanted = values("golden_sample.csv")
    equal(sorted(found), sorted(wanted), "quantities")
    for name, row in wanted.items():
        close(found[name], row["value"], row["tolerance"], name)


@test
def window_rule_of_the_manual():
    # Parity of L, nearest to share·L, ties up: the two worked cases of the rule and its corners.
    equal([peer.window_size(30, 0.5), peer.window_size(13, 0.4)], [16, 5], "worked cases")
    equal([peer.window_size(8, 1.0), peer.window_size(7, 1.0)], [8, 7], "whole flake")
    equal(peer.window_cells(4, 3, 0.5), {(1, 1), (2, 1)}, "4×3 cells")


main()
