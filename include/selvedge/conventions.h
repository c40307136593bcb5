/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file conventions.h
 * Conventions shared by the whole library. Documentation only; included by the other headers.
 *
 * **Sign.** ψ_k(R) = e^{ik·R} u_k, A = i⟨u|∂u⟩, Ω = ∂x Ay − ∂y Ax, C = (1/2π)∫Ω d²k over the
 * occupied bands, σ_xy = C e²/h (Xiao, Chang, Niu, Rev. Mod. Phys. 82, 1959 (2010)). Every marker
 * that leaves the library has this sign.
 *
 * **Matrix elements.** A hop from (a, cell R) to (b, cell R + s) with amplitude t adds
 * ⟨b, R+s|H|a, R⟩ = t and the complex conjugate on the transposed element.
 *
 * **Coordinates.** Positions are Cartesian, in lattice constants; a site lies at
 * i·a1 + j·a2 + (position of its orbital in the cell). Cell indices start at 0 for shapes made of
 * n1×n2 cells and are centred on 0 for hexagon, disc, annulus and triangle by side. An orientation
 * turns the lattice counter-clockwise about (0, 0); shapes stay.
 *
 * **Order of sites.** Cells by i, then j, then orbitals in the order of the model; sites that are
 * gone (vacancies) have no row.
 *
 * **Energies** are in the unit of the model; **angles** in radian.
 *
 * **Flux.** Electrons: ⟨R'|H|R⟩ carries exp(−2πi ∫A·dl) per flux quantum h/e; gauge A = φ u dv in
 * reduced coordinates r = u·a1 + v·a2, φ quanta per cell, straight path from R to R'.
 *
 * A flux Φ through a hole turns a hop from R to R' by exp(−iΦ Δθ), Δθ the angle (−π, π) from R to
 * R' seen from a point in the hole: the same up to a gauge as a phase exp(∓2πi Φ) on the hops
 * across a cut from the hole outwards, counter-clockwise (−) or clockwise (+).
 *
 * **Box disorder** is written by its full width W: V is uniform on [−W/2, W/2], variance W²/12.
 */
#ifndef SELVEDGE_CONVENTIONS_H
#define SELVEDGE_CONVENTIONS_H
#endif
