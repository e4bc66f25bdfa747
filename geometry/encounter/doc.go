// Package encounter answers whether an aircraft could touch the keep-out about
// a laser beam at any instant of the coming guard, given the last report of it.
// It rests on a theorem, stated and proven here, whose assumptions are the
// parameters of Report, Motion and KeepOut, and on nothing else: it keeps no
// state, knows no clock, and does not predict where an aircraft will be, but
// bounds where it can be.
//
// # Terms
//
// All in the site's frame (X east, Y north, Z up), |·| taken for the horizontal
// and the vertical part of a vector apart, each with its own bounds. x(u) is the
// true place of an aircraft at the instant u. A report states the instant m̂,
// the place p and the velocity v. Decisions fall at t_i, at most δ apart; one
// that comes later withdraws the permit.
//
// # Assumptions
//
//	(D) Each aircraft that could be in the keep-out K(u) has an accepted report
//	    at every t_i in [u - guard, u].
//	(R) The report was true at an instant m in [m̂ - ℓ, m̂ + ℓ']:
//	    |x(m) - p| <= E_p and |x'(m) - v| <= E_v. Without a velocity, only the
//	    former. (Early, Late, PositionError, VelocityError)
//	(M) |x''| <= a and |x'| <= V, relative to the Earth. (Motion)
//	(B) K(u) lies in the computed K̂(u), which counts aim error, rates,
//	    refraction and the extent of an aircraft. (KeepOut)
//	(C) The beam is on only under an open permit and at most the margin time
//	    past its end, so within guard after the decision that gave it.
//
// # Theorem
//
// Let τ = max(u - m̂ + ℓ, m̂ + ℓ' - u), λ = max(ℓ, ℓ') and
//
//	R(u) = {x: |x - p - v(u - m̂)| <= E_p + |v|λ + E_v τ + a τ²/2}
//	     ∩ {x: |x - p| <= E_p + V τ}
//
// (the second set alone without a velocity). Then the aircraft is in R(u) at u.
// If at every t_i the beam is shuttered whenever R(u) meets K̂(u) for some u in
// [t_i, t_i + guard], no aircraft is in K(u) at any instant u at which the beam
// is on.
//
// Proof. |u - m| <= τ, since m̂ - ℓ <= m <= m̂ + ℓ'. By (M), x(u) = x(m) +
// x'(m)(u - m) + w with |w| <= a(u - m)²/2 <= a τ²/2, before m as after it. So
//
//	x(u) - p - v(u - m̂) = [x(m) - p] + [x'(m) - v](u - m) + v(m̂ - m) + w,
//
// whose terms are at most E_p, E_v τ, |v|λ and a τ²/2 by (R); and
// |x(u) - p| <= |x(m) - p| + V|u - m|. Both hold for the horizontal and for the
// vertical part, each by its own bounds. Now let the beam be on at u. By (C) it
// is so under a permit decided at some t_i with u in [t_i, t_i + guard]. An
// aircraft that could be in K(u) had an accepted report then, by (D), and the
// decision was open, so that its R(u) does not meet K̂(u). It is in R(u), so it
// is not in K̂(u), nor in K(u), by (B). ∎
//
// For u at or after m̂ + (ℓ' - ℓ)/2, τ is u - m̂ + ℓ. The other case is a report
// stamped ahead of the clock. To keep one form over a whole guard that begins at
// t, τ = u - m̂ + max(ℓ, ℓ' - 2(t - m̂)) is used, which is not less for u >= t.
//
// # The vertical
//
// (R) and (M) speak of the aircraft's own vertical, K of the site's. At the
// horizontal distance d they lean by an angle whose sine is at most d/ρ, with ρ
// the least radius of curvature of the ellipsoid. Positions and velocities are
// turned exactly (Place). The bounds are enlarged: each horizontal one by the
// vertical one times d/ρ, and the other way round, with d taken where the reach
// ends; and the acceleration by V²/ρ, by which level flight bends down. With the
// default bounds, at 40 km, that adds 0.16 m/s² to the vertical acceleration and
// 0.03 m/s² to the horizontal one.
//
// # How it is computed
//
// K̂ over the guard is taken as one fixed volume, the union of two convex shapes:
// the axis' error and its rate times the guard widen the cone's angle, and the
// cylinder in proportion to the way along it. Two convex sets are apart if a
// plane parts them. For each shape a fixed fan of planes is tried: 32 about the
// axis, and some more about the ends and the shadow on the ground.
//
// For one plane the gap from R(u) is a concave function of u: the centres move
// straight, and the radii grow as a convex function. So a plane that parts at
// both ends of a stretch of time parts throughout, and the times at which it
// parts run between two roots of a quadratic. Touch first asks for one plane for
// the whole guard, then for a chain of them, the next taking over before the
// last fails. A clear answer is therefore a proof, for every instant and not
// for samples. Where no chain is found the answer is touched.
//
// The fan does not depend on any error, bound, latency, size or guard, but for
// the cone's planes, which lean with its angle; and each of these only lowers
// each gap. So a larger allowance never turns touched into clear, and a report
// that knows less is never clearer: exactly, not by luck. (A report whose speed
// contradicts (M) is the exception: it loses the bound on speed, which a larger
// V or E_v may give back.)
//
// What this costs against the sets themselves: up to 0.5 % of the distance
// between the centre of the reach and the axis, for the fan; the axis' error at
// the end of the guard, taken from its start; where both sets of R(u) matter, in
// reports several seconds old, the corners of their common part. The ends of the
// shapes, near the launch and at the ceiling's edge, are cut by fewer planes. For
// an aircraft of known altitude whose report is fresh that is some metres,
// rarely tens; without altitude, up to some hundreds.
//
// # Failing safe
//
// A number that is not finite, a size below zero, a volume never set, a reach of
// no report: touched, with a margin that is not a number. Comparisons are written
// so that NaN never parts.
package encounter
