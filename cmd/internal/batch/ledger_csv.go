package batch

import (
	"io"
	"math"
	"time"

	"drumlin/io/summary"
	"drumlin/io/tables"
)

// WriteLedgerCSV writes lines of the ledger as a table, in their order. Times are RFC 3339 in UTC. A failed region has no
// figures, and the numbers of its rows only where they are known.
func WriteLedgerCSV(w io.Writer, lines []Line) error {
	text := func(name string, of func(Line) string) tables.Column {
		c := tables.Column{Name: name, Text: make([]string, len(lines))}
		for i, line := range lines {
			c.Text[i] = of(line)
		}
		return c
	}
	number := func(name string, of func(Line) float64) tables.Column {
		c := tables.Column{Name: name, Number: make([]float64, len(lines))}
		for i, line := range lines {
			c.Number[i] = of(line)
		}
		return c
	}
	count := func(name string, of func(Line) int) tables.Column {
		return number(name, func(l Line) float64 {
			if n := of(l); n != 0 || l.Status != Failed {
				return float64(n)
			}
			return math.NaN()
		})
	}
	figure := func(name string, of func(Line) summary.Number) tables.Column {
		return number(name, func(l Line) float64 {
			if l.Status == Failed {
				return math.NaN()
			}
			return float64(of(l))
		})
	}
	return tables.Write(w, len(lines), []tables.Column{
		text("region", func(l Line) string { return l.Region }),
		text("folder", func(l Line) string { return l.Folder }),
		text("status", func(l Line) string { return string(l.Status) }),
		text("reason", func(l Line) string { return l.Reason }),
		count("observations", func(l Line) int { return l.Observations }),
		count("set_aside", func(l Line) int { return l.SetAside }),
		count("knots", func(l Line) int { return l.Knots }),
		figure("degrees_of_freedom", func(l Line) summary.Number { return l.DegreesOfFreedom }),
		figure("deviance_share", func(l Line) summary.Number { return l.DevianceShare }),
		text("distribution", func(l Line) string { return l.Distribution }),
		text("response", func(l Line) string { return l.Response }),
		text("unit", func(l Line) string { return l.Unit }),
		figure("total", func(l Line) summary.Number { return l.Total }),
		figure("total_cv", func(l Line) summary.Number { return l.TotalCV }),
		figure("mean", func(l Line) summary.Number { return l.Mean }),
		figure("mean_cv", func(l Line) summary.Number { return l.MeanCV }),
		text("worst_level", func(l Line) string { return string(l.WorstLevel) }),
		text("worst_check", func(l Line) string { return l.WorstCheck }),
		number("seconds", func(l Line) float64 { return l.Seconds }),
		text("cpu", func(l Line) string { return l.CPU }),
		text("host", func(l Line) string { return l.Host }),
		text("part", func(l Line) string { return l.Part }),
		text("ended", func(l Line) string { return ended(l.Ended) }),
		text("fingerprint", func(l Line) string { return l.Fingerprint }),
		text("version", func(l Line) string { return l.Version }),
	})
}

func ended(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return t.UTC().Format(time.RFC3339)
}
