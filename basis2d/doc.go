// Package basis2d holds functions of place to build smooth surfaces from, and the penalties that measure how much a
// surface bends. It knows nothing of statistics.
//
// The thin-plate basis spans, for knots t_1..t_K in the plane,
//
//	f(s) = a0 + a1 x + a2 y + sum_k d_k eta(|s - t_k|),   eta(r) = r^2 log r / (8 pi),   sum_k d_k (1, t_k) = 0,
//
// with J(f) = d'E d = integral of f_xx^2 + 2 f_xy^2 + f_yy^2 over the plane, E_kl = eta(|t_k - t_l|)
// (Duchon 1977; Wahba 1990).
package basis2d
