package observe

import (
	"cmp"
	"fmt"
	"iter"
	"slices"
	"strconv"
	"strings"
)

// Lost tells of rows that were set aside when a table was read, by the key they have in some column: for each key the
// first of its rows, and under "" the first without a key. A Table alone does not know these keys.
type Lost map[string]Aside

// Lost finds the keys of the rows that t has set aside. The other table is read from the same source with nothing
// but the key kept, so that it has every row. The result is never nil. Lost panics if the other table has no text column
// of the name.
func (t *Table) Lost(all *Table, key string) Lost {
	lost := Lost{}
	if len(t.Aside) == 0 {
		return lost
	}
	column := all.text(key)
	code := make(map[int32]int32, all.Len())
	for i, row := range all.Row {
		code[row] = column.Code[i]
	}
	for _, a := range t.Aside {
		c, there := code[a.Row]
		if !there {
			continue
		}
		key := ""
		if c >= 0 {
			key = column.Level[c]
		}
		if _, seen := lost[key]; !seen {
			lost[key] = a
		}
	}
	return lost
}

// alone says that a row cannot be used, as one of n such rows.
func (a Aside) alone(n int) string {
	text := a.sentence() + ", so the row is set aside"
	if n > 1 {
		text += fmt.Sprintf(", one of %d", n)
	}
	return text
}

// text returns a column that was read as text; not to have it is a mistake of the caller.
func (t *Table) text(name string) *Column {
	c := t.Column(name)
	if c == nil || c.Code == nil && t.Len() > 0 {
		panic(fmt.Sprintf("observe: %s has no text column %q", t.Source, name))
	}
	return c
}

// number returns a column that was read as numbers; not to have it is a mistake of the caller.
func (t *Table) number(name string) *Column {
	c := t.Column(name)
	if c == nil || c.Number == nil && t.Len() > 0 {
		panic(fmt.Sprintf("observe: %s has no column %q of numbers", t.Source, name))
	}
	return c
}

// withoutKey sets a row of t aside for want of a key.
func (t *Table) withoutKey(row int, key string) Aside {
	return Aside{Line: t.Line[row], Row: t.Row[row], Column: key, Code: "missing-key", Reason: "key is missing"}
}

// addAside puts rows that are set aside now among those that were before, in the order of the source.
func (t *Table) addAside(rows []Aside) []Aside {
	all := slices.Concat(t.Aside, rows)
	slices.SortStableFunc(all, func(a, b Aside) int { return cmp.Compare(a.Row, b.Row) })
	return all
}

// checkAside refuses what a table has come to with more rows set aside: the first of them if strict, and all if more
// than half of the rows are lost.
func (t *Table) checkAside(rows []Aside, strict bool, advice string) error {
	if strict && len(rows) > 0 {
		a := rows[0]
		return &Error{File: t.Source, Line: int(a.Line), Row: int(a.Row), Column: a.Column, Value: a.Value, What: a.sentence(),
			Advice: "correct the row, or leave out --strict to set such rows aside"}
	}
	lost, all := rows, t.Len()
	if t.Len()+len(t.Aside) == t.Rows { // otherwise rows were summed, and a sum is not to be weighed against single rows
		lost, all = t.addAside(rows), t.Rows
	}
	if len(lost) <= all/2 {
		return nil
	}
	e, _ := mostlyAside(t.Source, slices.Values(lost), len(lost), all)
	e.Advice = advice
	return e
}

// mostlyAside says why n of all rows are unusable: up to three reasons, and the first row as an example, which it returns.
func mostlyAside(source string, asides iter.Seq[Aside], n, all int) (*Error, Aside) {
	counts := countAside(asides)
	var reasons []string
	for i, c := range counts {
		if i == 3 {
			reasons = append(reasons, fmt.Sprintf("%d more reasons", len(counts)-i))
			break
		}
		reasons = append(reasons, fmt.Sprintf("column %q, %s (%d)", c.Column, c.Reason, c.Rows))
	}
	var first Aside
	for a := range asides {
		if a.Code == counts[0].Code && a.Column == counts[0].Column && a.commonReason() == counts[0].Reason {
			first = a
			break
		}
	}
	return &Error{File: source, Value: first.Value,
		What: fmt.Sprintf("%d of %d rows cannot be used, more than half: %s; for example %s, where %s",
			n, all, strings.Join(reasons, "; "), rowWord(first.Row, first.Line), first.sentence())}, first
}

// rowWord names a row within a sentence, as Error does in front of one.
func rowWord(row, line int32) string { return fmt.Sprintf("row %d (line %d)", row, line) }

// pick returns a column of the given rows: 0 and no text for row -1. It shares nothing with c.
func (c *Column) pick(rows []int32) Column {
	p := Column{Name: c.Name}
	if c.Number != nil {
		p.Number = make([]float64, len(rows))
		for i, r := range rows {
			if r >= 0 {
				p.Number[i] = c.Number[r]
			}
		}
	}
	if c.Code != nil {
		p.Code, p.Level = make([]int32, len(rows)), slices.Clone(c.Level)
		for i, r := range rows {
			p.Code[i] = -1
			if r >= 0 {
				p.Code[i] = c.Code[r]
			}
		}
		p.dropUnused()
	}
	return p
}

// dropUnused leaves out the levels that no row has any more. The others stay in their order.
func (c *Column) dropUnused() {
	used := make([]bool, len(c.Level))
	for _, code := range c.Code {
		if code >= 0 {
			used[code] = true
		}
	}
	to := make([]int32, len(c.Level))
	levels := c.Level[:0]
	for code, level := range c.Level {
		if used[code] {
			to[code] = int32(len(levels))
			levels = append(levels, level)
		}
	}
	clear(c.Level[len(levels):])
	c.Level = levels
	for i, code := range c.Code {
		if code >= 0 {
			c.Code[i] = to[code]
		}
	}
}

// pickSlice returns the entries of the given rows: the zero value for row -1.
func pickSlice[T any](from []T, rows []int32) []T {
	picked := make([]T, len(rows))
	for i, r := range rows {
		if r >= 0 {
			picked[i] = from[r]
		}
	}
	return picked
}

// fewQuoted lists up to a number of values in quotes, and says how many more there are.
func fewQuoted(values []string, most int) string {
	var list []string
	for _, v := range values[:min(most, len(values))] {
		list = append(list, strconv.Quote(shorten(v)))
	}
	return andMore(list, len(values))
}

// andMore writes a list that was cut short.
func andMore(list []string, all int) string {
	text := strings.Join(list, ", ")
	if more := all - len(list); more > 0 {
		text += fmt.Sprintf(" and %d more", more)
	}
	return text
}
