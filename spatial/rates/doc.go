// Package rates holds what is computed of the rates of places: exact intervals, for counts (CountLimits) and for shares
// (ShareLimits). It knows neither places nor files.
package rates
