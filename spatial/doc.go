// Package spatial fits a penalised smooth surface over the plane to observations at places, and answers questions
// about it: levels with standard errors anywhere, sums over sets of places, posterior draws.
//
// The model is
//
//	g(mu_i) = log e_i (or 0) + x_i'a + f(s_i),   y_i ~ distribution(mu_i, phi/w_i),
//
// with f a thin-plate surface (Duchon 1977; Wahba 1990) whose smoothness the data choose by restricted maximum
// likelihood (Wood 2011) or cross-validation. The posterior of the coefficients is normal with covariance
// phi (X'WX + S)^-1 (Silverman 1985; Nychka 1988). Places are in metres in a plane; nothing here knows of longitude and
// latitude, of files, or of units other than those of the response.
package spatial
