// Package spatial fits a penalised smooth surface over the plane to observations at places, and answers questions
// about it: levels with standard errors anywhere, sums over sets of places, posterior draws.
//
// The model is
//
//	g(mu_i) = log e_i (or 0) + x_i'a + f(s_i),   y_i ~ distribution(mu_i, phi/w_i),
//
// or, where row i is a set of points q with shares s_iq that sum to one, such as an area with the people in it,
//
//	mu_i = e_i sum_q s_iq h(x_i'a + f(s_iq)),   h the inverse of g,
//
// the composite link (Thompson & Baker 1981, Appl. Statist. 30:125-131): it is the points' levels that are averaged, not
// their linear predictors.
//
// f is a thin-plate surface (Duchon 1977; Wahba 1990) whose smoothness the data choose by restricted maximum likelihood
// (Wood 2011) or cross-validation. The posterior of the coefficients is normal with covariance phi (X'WX + S)^-1
// (Silverman 1985; Nychka 1988), X'WX being minus the log-likelihood's second derivative times phi also where rows are
// sets, unless cross-validation chose the smoothness: it works with the model linearised at the fit. Places are in metres in a plane; nothing here knows of longitude and latitude, of files, or of units other than
// those of the response.
package spatial
