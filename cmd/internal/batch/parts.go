package batch

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"
	"strings"
)

// Part is a share of a batch's regions, counted from 1. The zero value is the whole batch.
type Part struct{ Index, Of int }

// mostParts bounds how many parts a batch is divided into.
const mostParts = 100_000

// String returns the part as "3/16", or nothing for the whole batch.
func (p Part) String() string {
	if p == (Part{}) {
		return ""
	}
	return fmt.Sprintf("%d/%d", p.Index, p.Of)
}

// ParsePart reads which part of a batch is meant: "3/16", or "auto" where the engine that started the process says so in
// variables that getenv returns, or "auto/16" where it may not say how many there are or may start only some of them.
// Errors carry a hint.
func ParsePart(text string, getenv func(string) string) (Part, error) {
	index, rest, divided := strings.Cut(text, "/")
	var of int
	if divided {
		var ok bool
		if of, ok = whole(rest); !ok || of < 1 || of > mostParts {
			return Part{}, misstated(text, "%q is not a number of parts", rest)
		}
	}
	if index == "auto" {
		return partOfArray(of, getenv)
	}
	k, ok := whole(index)
	switch {
	case !ok || !divided:
		return Part{}, misstated(text, "that is not a part")
	case k < 1 || k > of:
		return Part{}, misstated(text, "parts are counted from 1 to %d", of)
	}
	return Part{k, of}, nil
}

func misstated(text, format string, args ...any) error {
	return &fault{fmt.Sprintf("part: %q: ", text) + fmt.Sprintf(format, args...),
		fmt.Sprintf("give its number and how many there are, up to %d, as in 3/16, or auto under an engine that runs arrays", mostParts)}
}

// whole reads a number without a sign.
func whole(text string) (int, bool) {
	if strings.Trim(text, "0123456789") != "" {
		return 0, false
	}
	n, err := strconv.Atoi(text)
	return n, err == nil
}

// Shares divides regions of the given sizes among parts: largest first, each to the part with the least so far (Graham
// 1969, SIAM J. Appl. Math. 17:416-429: the largest share is at most 4/3 of what the best division comes to). Of equal
// sizes the first goes first; of parts with equally much, the one with fewer regions, then the first, takes the next. Each
// share lists its regions in ascending order. Shares panics if of is below 1 or a size is negative.
func Shares(size []int64, of int) [][]int {
	if of < 1 || slices.ContainsFunc(size, func(s int64) bool { return s < 0 }) {
		panic(badShares)
	}
	order := make([]int, len(size))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(size[j], size[i]) })
	loads := make([]load, of) // a heap with the least loaded part on top: all equal and in order to begin with
	for k := range loads {
		loads[k].part = k
	}
	shares := make([][]int, of)
	for _, i := range order {
		least := &loads[0]
		shares[least.part] = append(shares[least.part], i)
		least.size += size[i]
		least.regions++
		sink(loads)
	}
	for _, s := range shares {
		slices.Sort(s)
	}
	return shares
}

const badShares = "batch: no parts, or a region of negative size"

// load is what a part has so far.
type load struct {
	size          int64
	regions, part int
}

func (a load) less(b load) bool {
	return cmp.Or(cmp.Compare(a.size, b.size), cmp.Compare(a.regions, b.regions), cmp.Compare(a.part, b.part)) < 0
}

// sink puts the top of a heap, which has grown, back in its place.
func sink(heap []load) {
	for k := 0; 2*k+1 < len(heap); {
		child := 2*k + 1
		if child+1 < len(heap) && heap[child+1].less(heap[child]) {
			child++
		}
		if heap[k].less(heap[child]) {
			return
		}
		heap[k], heap[child] = heap[child], heap[k]
		k = child
	}
}

// array is how an engine tells a process which one of an array it is. The variables' names are those of the engines'
// public documentation, from memory.
type array struct {
	engine string
	id     string // variable: the process's number
	none   string // what that holds outside an array, where it is set all the same
	base   int    // number of the first process where the engine does not tell it
	count  string // variable: how many processes there are
	// Variables: the numbers that whoever started the array has chosen.
	first, last, step string
}

var arrays = []array{
	{engine: "Slurm", id: "SLURM_ARRAY_TASK_ID", base: 1, count: "SLURM_ARRAY_TASK_COUNT",
		first: "SLURM_ARRAY_TASK_MIN", last: "SLURM_ARRAY_TASK_MAX", step: "SLURM_ARRAY_TASK_STEP"},
	{engine: "Kubernetes", id: "JOB_COMPLETION_INDEX"},
	{engine: "AWS Batch", id: "AWS_BATCH_JOB_ARRAY_INDEX", count: "AWS_BATCH_JOB_ARRAY_SIZE"},
	{engine: "Google Cloud Batch", id: "BATCH_TASK_INDEX", count: "BATCH_TASK_COUNT"},
	{engine: "Cloud Run", id: "CLOUD_RUN_TASK_INDEX", count: "CLOUD_RUN_TASK_COUNT"},
	{engine: "PBS", id: "PBS_ARRAY_INDEX", base: 1},
	{engine: "LSF", id: "LSB_JOBINDEX", none: "0", base: 1, last: "LSB_JOBINDEX_END", step: "LSB_JOBINDEX_STEP"},
	{engine: "Grid Engine", id: "SGE_TASK_ID", none: "undefined", base: 1,
		first: "SGE_TASK_FIRST", last: "SGE_TASK_LAST", step: "SGE_TASK_STEPSIZE"},
}

const (
	sayParts  = "say how many parts there are, as in --part auto/16, and number the array from 1 to that"
	sayNumber = "start it in an array of one of these, or say which part it is, as in --part 3/16"
)

// partOfArray asks every engine, of which one may run inside another. A count of 0 is not known.
func partOfArray(count int, getenv func(string) string) (Part, error) {
	var found Part
	var teller array
	for _, a := range arrays {
		if id := getenv(a.id); id == "" || id == a.none {
			continue
		}
		p, err := a.place(count, getenv)
		if err != nil {
			return Part{}, err
		}
		if teller.id != "" && (p.Index != found.Index || p.Of > 0 && found.Of > 0 && p.Of != found.Of) {
			return Part{}, &fault{fmt.Sprintf("part: %s says part %s, but %s part %s", teller.id, found.told(), a.id, p.told()),
				"unset the variables of the engine that did not divide the batch, or say which part it is, as in --part 3/16"}
		}
		if teller.id == "" || found.Of == 0 {
			found, teller = p, a
		}
	}
	switch {
	case teller.id == "":
		return Part{}, &fault{"part: auto: no engine has set its array variables: " + engineNames(), sayNumber}
	case found.Of == 0:
		return Part{}, &fault{fmt.Sprintf("part: auto: %s does not tell how many processes its array has", teller.engine), sayParts}
	}
	return found, nil
}

// told returns the part in words where the count may not be known.
func (p Part) told() string {
	if p.Of == 0 {
		return strconv.Itoa(p.Index)
	}
	return p.String()
}

func engineNames() string {
	names := make([]string, len(arrays))
	for i, a := range arrays {
		names[i] = a.engine
	}
	return strings.Join(names, ", ")
}

// place returns the part that the engine's variables stand for, of the given count if that is not 0.
func (a array) place(count int, getenv func(string) string) (Part, error) {
	v := variables{getenv: getenv}
	id, told := v.number(a.id, 0), v.number(a.count, 0)
	first, last, step := v.number(a.first, a.base), v.number(a.last, -1), v.number(a.step, 1)
	switch {
	case v.err != nil:
		return Part{}, v.err
	case last >= 0:
		return a.inSpan(id, told, first, last, step, count)
	case count > 0 && told > 0 && count != told:
		return Part{}, &fault{fmt.Sprintf("part: auto/%d: %s is %d", count, a.count, told), "make the two the same"}
	}
	p := Part{id - a.base + 1, max(count, told)}
	switch {
	case p.Index < 1:
		return Part{}, &fault{fmt.Sprintf("part: %s is %d, and parts are counted from 1", a.id, id), "number the array from 1"}
	case p.Of > 0 && p.Index > p.Of:
		return Part{}, &fault{fmt.Sprintf("part: %s is %d, beyond the %d parts", a.id, id, p.Of), sayParts}
	case p.Of > mostParts:
		return Part{}, tooMany(a.count, p.Of)
	}
	return p, nil
}

// inSpan places a process in an array whose numbers could be chosen. If they are as many as there are parts, its place
// among them tells the part. Otherwise the number itself does, so that some of the parts can be started again.
func (a array) inSpan(id, told, first, last, step, count int) (Part, error) {
	span := fmt.Sprintf("%d to %d", first, last)
	if step > 1 {
		span += fmt.Sprintf(" by %d", step)
	}
	if step < 1 || first > last || id < first || id > last {
		return Part{}, a.outside(id, span)
	}
	n := (last-first)/step + 1
	gaps := told > 0 && told != n
	switch {
	case !gaps && (id-first)%step != 0:
		return Part{}, a.outside(id, span)
	case gaps && count == 0:
		return Part{}, &fault{fmt.Sprintf("part: auto: %s is %d, but the numbers go from %s, so some are left out", a.count, told, span), sayParts}
	case count == 0 && n > mostParts:
		return Part{}, tooMany(a.last, n)
	case count == 0 || !gaps && count == n:
		return Part{(id-first)/step + 1, n}, nil
	}
	base := min(a.base, first) // numbers with a 0 among them are counted from 0
	if last-base+1 > count {
		return Part{}, &fault{fmt.Sprintf("part: auto/%d: the numbers of the array go from %s", count, span), sayParts}
	}
	return Part{id - base + 1, count}, nil
}

func (a array) outside(id int, span string) error {
	return &fault{fmt.Sprintf("part: %s is %d, which is not among the array's %s", a.id, id, span), "say which part it is, as in --part 3/16"}
}

func tooMany(variable string, n int) error {
	return &fault{fmt.Sprintf("part: %s makes %d parts", variable, n), fmt.Sprintf("a batch has up to %d parts", mostParts)}
}

// variables reads numbers out of an environment and keeps the first error.
type variables struct {
	getenv func(string) string
	err    error
}

// number returns a variable, or another value where there is no such variable or it is not set.
func (v *variables) number(name string, otherwise int) int {
	if name == "" {
		return otherwise
	}
	text := v.getenv(name)
	if text == "" {
		return otherwise
	}
	n, ok := whole(text)
	if !ok && v.err == nil {
		v.err = &fault{fmt.Sprintf("part: %s: %q is not a whole number", name, text), "say which part it is, as in --part 3/16"}
	}
	return n
}
