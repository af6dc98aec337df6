package batch

import "math"

// minimise returns where f, a smooth function with one valley, is least, and its value there: a bracket from a coarse
// grid over [lo, hi] that is widened where the best lies at its end, then Brent's method (Brent 1973, Algorithms for
// Minimization without Derivatives, ch. 5) to 1e-5. An error of f ends the search.
func minimise(lo, hi float64, f func(float64) (float64, error)) (x, value float64, err error) {
	const points, widest = 6, 12 // steps of the grid, and how often it may be widened
	step := math.Max((hi-lo)/points, math.Ln2)
	middle := (lo + hi) / 2
	at, v := []float64{}, []float64{}
	for k := -points / 2; k <= points/2; k++ {
		at = append(at, middle+float64(k)*step)
	}
	for _, x := range at {
		y, err := f(x)
		if err != nil {
			return 0, 0, err
		}
		v = append(v, y)
	}
	for range widest {
		best := least(v)
		var next float64
		switch best {
		case 0:
			next = at[0] - step
		case len(at) - 1:
			next = at[len(at)-1] + step
		default:
			return brent(at[best-1], at[best], at[best+1], v[best], f)
		}
		y, err := f(next)
		if err != nil {
			return 0, 0, err
		}
		if best == 0 {
			at, v = append([]float64{next}, at...), append([]float64{y}, v...)
		} else {
			at, v = append(at, next), append(v, y)
		}
	}
	best := least(v)
	return at[best], v[best], nil
}

func least(v []float64) int {
	best := 0
	for k := range v {
		if v[k] < v[best] {
			best = k
		}
	}
	return best
}

// brent searches [a, b] from x inside it, where f is fx.
func brent(a, x, b, fx float64, f func(float64) (float64, error)) (float64, float64, error) {
	const golden, tolerance, most = 0.3819660112501051, 1e-5, 40
	w, v, fw, fv := x, x, fx, fx
	var d, e float64
	for range most {
		m := (a + b) / 2
		if math.Abs(x-m) <= 2*tolerance-(b-a)/2 {
			break
		}
		parabola := false
		if math.Abs(e) > tolerance {
			r, q := (x-w)*(fx-fv), (x-v)*(fx-fw)
			p := (x-v)*q - (x-w)*r
			if q = 2 * (q - r); q > 0 {
				p = -p
			} else {
				q = -q
			}
			if math.Abs(p) < math.Abs(q*e/2) && p > q*(a-x) && p < q*(b-x) {
				d, e, parabola = p/q, d, true
				if u := x + d; u-a < 2*tolerance || b-u < 2*tolerance {
					d = math.Copysign(tolerance, m-x)
				}
			}
		}
		if !parabola {
			if e = b - x; x >= m {
				e = a - x
			}
			d = golden * e
		}
		u := x + d
		if math.Abs(d) < tolerance {
			u = x + math.Copysign(tolerance, d)
		}
		fu, err := f(u)
		if err != nil {
			return 0, 0, err
		}
		switch {
		case fu <= fx:
			if u >= x {
				a = x
			} else {
				b = x
			}
			v, fv, w, fw, x, fx = w, fw, x, fx, u, fu
		default:
			if u < x {
				a = u
			} else {
				b = u
			}
			switch {
			case fu <= fw || w == x:
				v, fv, w, fw = w, fw, u, fu
			case fu <= fv || v == x || v == w:
				v, fv = u, fu
			}
		}
	}
	return x, fx, nil
}
