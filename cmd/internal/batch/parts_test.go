package batch

import (
	"errors"
	"fmt"
	"maps"
	"reflect"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// environment reads the variables of an engine: "name value name value".
func environment(pairs string) func(string) string {
	fields, values := strings.Fields(pairs), map[string]string{}
	for i := 0; i+1 < len(fields); i += 2 {
		values[fields[i]] = fields[i+1]
	}
	return func(name string) string { return values[name] }
}

func slurm(id, first, last, step, count int) string {
	return fmt.Sprintf("SLURM_ARRAY_TASK_ID %d SLURM_ARRAY_TASK_MIN %d SLURM_ARRAY_TASK_MAX %d SLURM_ARRAY_TASK_STEP %d SLURM_ARRAY_TASK_COUNT %d",
		id, first, last, step, count)
}

func gridEngine(id, first, last, step string) string {
	return fmt.Sprintf("SGE_TASK_ID %s SGE_TASK_FIRST %s SGE_TASK_LAST %s SGE_TASK_STEPSIZE %s", id, first, last, step)
}

func TestParsePart(t *testing.T) {
	for _, c := range []struct {
		about, text, variables string
		want                   string // the part, or what the error says
	}{
		{"plain", "3/16", "", "3/16"},
		{"first", "1/1", "", "1/1"},
		{"most", "100000/100000", "", "100000/100000"},
		{"whatever the variables", "3/16", slurm(1, 1, 4, 1, 4), "3/16"},
		{"zero", "0/16", "", `part: "0/16": parts are counted from 1 to 16`},
		{"beyond", "17/16", "", `part: "17/16": parts are counted from 1 to 16`},
		{"too many", "1/100001", "", `part: "1/100001": "100001" is not a number of parts`},
		{"no parts", "1/0", "", `part: "1/0": "0" is not a number of parts`},
		{"far too many", "1/99999999999999999999", "", `part: "1/99999999999999999999": "99999999999999999999" is not a number of parts`},
		{"negative", "-1/16", "", `part: "-1/16": that is not a part`},
		{"signed", "+1/16", "", `part: "+1/16": that is not a part`},
		{"blank", "1/ 16", "", `part: "1/ 16": " 16" is not a number of parts`},
		{"no count", "3", "", `part: "3": that is not a part`},
		{"count missing", "3/", "", `part: "3/": "" is not a number of parts`},
		{"number missing", "/3", "", `part: "/3": that is not a part`},
		{"three numbers", "1/2/3", "", `part: "1/2/3": "2/3" is not a number of parts`},
		{"empty", "", "", `part: "": that is not a part`},
		{"a word", "all", "", `part: "all": that is not a part`},
		{"auto of nothing", "auto/0", slurm(1, 1, 4, 1, 4), `part: "auto/0": "0" is not a number of parts`},

		{"no engine", "auto", "", "part: auto: no engine has set its array variables: " +
			"Slurm, Kubernetes, AWS Batch, Google Cloud Batch, Cloud Run, PBS, LSF, Grid Engine"},

		{"Slurm", "auto", slurm(3, 1, 16, 1, 16), "3/16"},
		{"Slurm from 0", "auto", slurm(3, 0, 15, 1, 16), "4/16"},
		{"Slurm by steps", "auto", slurm(9, 1, 15, 4, 4), "3/4"},
		{"Slurm with a last one not reached", "auto", slurm(9, 1, 12, 4, 3), "3/3"},
		{"Slurm without a count", "auto", "SLURM_ARRAY_TASK_ID 3 SLURM_ARRAY_TASK_MIN 2 SLURM_ARRAY_TASK_MAX 4", "2/3"},
		{"Slurm without a range", "auto", "SLURM_ARRAY_TASK_ID 3 SLURM_ARRAY_TASK_COUNT 4", "3/4"},
		{"Slurm with neither", "auto", "SLURM_ARRAY_TASK_ID 3", "part: auto: Slurm does not tell how many processes its array has"},
		{"Slurm with gaps", "auto", slurm(3, 1, 7, 1, 3),
			"part: auto: SLURM_ARRAY_TASK_COUNT is 3, but the numbers go from 1 to 7, so some are left out"},
		{"Slurm with more than the range holds", "auto", slurm(3, 1, 7, 2, 9),
			"part: auto: SLURM_ARRAY_TASK_COUNT is 9, but the numbers go from 1 to 7 by 2, so some are left out"},
		{"Slurm beyond", "auto", slurm(8, 1, 7, 1, 7), "part: SLURM_ARRAY_TASK_ID is 8, which is not among the array's 1 to 7"},
		{"Slurm below", "auto", slurm(0, 1, 7, 1, 7), "part: SLURM_ARRAY_TASK_ID is 0, which is not among the array's 1 to 7"},
		{"Slurm between", "auto", slurm(4, 1, 7, 2, 4), "part: SLURM_ARRAY_TASK_ID is 4, which is not among the array's 1 to 7 by 2"},
		{"Slurm backwards", "auto", slurm(3, 7, 1, 1, 7), "part: SLURM_ARRAY_TASK_ID is 3, which is not among the array's 7 to 1"},
		{"Slurm without a step", "auto", slurm(3, 1, 7, 0, 7), "part: SLURM_ARRAY_TASK_ID is 3, which is not among the array's 1 to 7"},
		{"Slurm with too many", "auto", slurm(3, 1, 100_001, 1, 100_001), "part: SLURM_ARRAY_TASK_MAX makes 100001 parts"},
		{"Slurm with words", "auto", "SLURM_ARRAY_TASK_ID three", `part: SLURM_ARRAY_TASK_ID: "three" is not a whole number`},
		{"Slurm with a sign", "auto", slurm(-3, 1, 7, 1, 7), `part: SLURM_ARRAY_TASK_ID: "-3" is not a whole number`},
		{"Slurm with a word for a range", "auto", "SLURM_ARRAY_TASK_ID 3 SLURM_ARRAY_TASK_MAX x", `part: SLURM_ARRAY_TASK_MAX: "x" is not a whole number`},
		{"Slurm, number known", "auto/16", slurm(3, 1, 16, 1, 16), "3/16"},
		{"Slurm from 0, number known", "auto/16", slurm(3, 0, 15, 1, 16), "4/16"},
		{"Slurm from 101, number known", "auto/16", slurm(103, 101, 116, 1, 16), "3/16"},
		{"Slurm, some parts again", "auto/16", slurm(7, 3, 9, 1, 3), "7/16"},
		{"Slurm, one part again", "auto/16", slurm(3, 3, 3, 1, 1), "3/16"},
		{"Slurm, some parts in a row again", "auto/16", slurm(4, 3, 5, 1, 3), "4/16"},
		{"Slurm, some parts again from 0", "auto/16", slurm(7, 0, 9, 1, 3), "8/16"},
		{"Slurm, only the one of 0", "auto/16", slurm(0, 0, 0, 1, 1), "1/16"},
		{"Slurm, as many numbers as parts, with gaps", "auto/3", slurm(1, 1, 4, 1, 3), "part: auto/3: the numbers of the array go from 1 to 4"},
		{"Slurm, more than known", "auto/16", slurm(3, 1, 20, 1, 20), "part: auto/16: the numbers of the array go from 1 to 20"},
		{"Slurm from 0, more than known", "auto/16", slurm(3, 0, 16, 1, 17), "part: auto/16: the numbers of the array go from 0 to 16"},
		{"Slurm, only the number", "auto/16", "SLURM_ARRAY_TASK_ID 3", "3/16"},

		{"Kubernetes", "auto/16", "JOB_COMPLETION_INDEX 0", "1/16"},
		{"Kubernetes, last", "auto/16", "JOB_COMPLETION_INDEX 15", "16/16"},
		{"Kubernetes, beyond", "auto/16", "JOB_COMPLETION_INDEX 16", "part: JOB_COMPLETION_INDEX is 16, beyond the 16 parts"},
		{"Kubernetes, number not known", "auto", "JOB_COMPLETION_INDEX 3", "part: auto: Kubernetes does not tell how many processes its array has"},
		{"Kubernetes with words", "auto/16", "JOB_COMPLETION_INDEX first", `part: JOB_COMPLETION_INDEX: "first" is not a whole number`},

		{"AWS Batch", "auto", "AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE 16", "3/16"},
		{"AWS Batch, number known", "auto/16", "AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE 16", "3/16"},
		{"AWS Batch, other number", "auto/16", "AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE 8",
			"part: auto/16: AWS_BATCH_JOB_ARRAY_SIZE is 8"},
		{"AWS Batch, beyond", "auto", "AWS_BATCH_JOB_ARRAY_INDEX 16 AWS_BATCH_JOB_ARRAY_SIZE 16",
			"part: AWS_BATCH_JOB_ARRAY_INDEX is 16, beyond the 16 parts"},
		{"AWS Batch without a size", "auto", "AWS_BATCH_JOB_ARRAY_INDEX 2", "part: auto: AWS Batch does not tell how many processes its array has"},
		{"AWS Batch with a word for a size", "auto", "AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE many",
			`part: AWS_BATCH_JOB_ARRAY_SIZE: "many" is not a whole number`},

		{"Google Cloud Batch", "auto", "BATCH_TASK_INDEX 0 BATCH_TASK_COUNT 4", "1/4"},
		{"Google Cloud Batch, other number", "auto/5", "BATCH_TASK_INDEX 0 BATCH_TASK_COUNT 4", "part: auto/5: BATCH_TASK_COUNT is 4"},
		{"Google Cloud Batch, beyond", "auto", "BATCH_TASK_INDEX 4 BATCH_TASK_COUNT 4", "part: BATCH_TASK_INDEX is 4, beyond the 4 parts"},
		{"Google Cloud Batch with too many", "auto", "BATCH_TASK_INDEX 4 BATCH_TASK_COUNT 200000", "part: BATCH_TASK_COUNT makes 200000 parts"},

		{"Cloud Run", "auto", "CLOUD_RUN_TASK_INDEX 3 CLOUD_RUN_TASK_COUNT 4", "4/4"},
		{"Cloud Run, other number", "auto/5", "CLOUD_RUN_TASK_INDEX 3 CLOUD_RUN_TASK_COUNT 4", "part: auto/5: CLOUD_RUN_TASK_COUNT is 4"},
		{"Cloud Run with words", "auto", "CLOUD_RUN_TASK_INDEX x CLOUD_RUN_TASK_COUNT 4", `part: CLOUD_RUN_TASK_INDEX: "x" is not a whole number`},

		{"PBS", "auto/16", "PBS_ARRAY_INDEX 3", "3/16"},
		{"PBS, last", "auto/16", "PBS_ARRAY_INDEX 16", "16/16"},
		{"PBS, beyond", "auto/16", "PBS_ARRAY_INDEX 17", "part: PBS_ARRAY_INDEX is 17, beyond the 16 parts"},
		{"PBS from 0", "auto/16", "PBS_ARRAY_INDEX 0", "part: PBS_ARRAY_INDEX is 0, and parts are counted from 1"},
		{"PBS, number not known", "auto", "PBS_ARRAY_INDEX 3", "part: auto: PBS does not tell how many processes its array has"},

		{"LSF", "auto", "LSB_JOBINDEX 3 LSB_JOBINDEX_END 16", "3/16"},
		{"LSF by steps", "auto", "LSB_JOBINDEX 5 LSB_JOBINDEX_END 16 LSB_JOBINDEX_STEP 2", "3/8"},
		{"LSF, number known", "auto/16", "LSB_JOBINDEX 3 LSB_JOBINDEX_END 16", "3/16"},
		{"LSF, some parts again", "auto/16", "LSB_JOBINDEX 3 LSB_JOBINDEX_END 7", "3/16"},
		{"LSF, more than known", "auto/16", "LSB_JOBINDEX 3 LSB_JOBINDEX_END 17", "part: auto/16: the numbers of the array go from 1 to 17"},
		{"LSF, beyond", "auto", "LSB_JOBINDEX 17 LSB_JOBINDEX_END 16", "part: LSB_JOBINDEX is 17, which is not among the array's 1 to 16"},
		{"LSF outside an array", "auto/16", "LSB_JOBINDEX 0 PBS_ARRAY_INDEX 3", "3/16"},

		{"Grid Engine", "auto", gridEngine("3", "1", "16", "1"), "3/16"},
		{"Grid Engine by steps", "auto", gridEngine("8", "2", "11", "3"), "3/4"},
		{"Grid Engine, number known", "auto/16", gridEngine("3", "1", "16", "1"), "3/16"},
		{"Grid Engine, one part again", "auto/16", gridEngine("3", "3", "3", "1"), "3/16"},
		{"Grid Engine, more than known", "auto/16", gridEngine("3", "1", "17", "1"), "part: auto/16: the numbers of the array go from 1 to 17"},
		{"Grid Engine, beyond", "auto", gridEngine("17", "1", "16", "1"), "part: SGE_TASK_ID is 17, which is not among the array's 1 to 16"},
		{"Grid Engine with words", "auto", gridEngine("3", "1", "16", "few"), `part: SGE_TASK_STEPSIZE: "few" is not a whole number`},
		{"Grid Engine outside an array", "auto/4", gridEngine("undefined", "undefined", "undefined", "undefined") + " JOB_COMPLETION_INDEX 1", "2/4"},

		{"two that agree", "auto", slurm(3, 1, 16, 1, 16) + " AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE 16", "3/16"},
		{"two of which the first does not count", "auto", "JOB_COMPLETION_INDEX 2 BATCH_TASK_INDEX 2 BATCH_TASK_COUNT 4", "3/4"},
		{"two of which the second does not count", "auto", "BATCH_TASK_INDEX 2 BATCH_TASK_COUNT 4 PBS_ARRAY_INDEX 3", "3/4"},
		{"two that disagree in number", "auto", slurm(3, 1, 16, 1, 16) + " AWS_BATCH_JOB_ARRAY_INDEX 3 AWS_BATCH_JOB_ARRAY_SIZE 16",
			"part: SLURM_ARRAY_TASK_ID says part 3/16, but AWS_BATCH_JOB_ARRAY_INDEX part 4/16"},
		{"two that disagree in count", "auto", slurm(3, 1, 16, 1, 16) + " AWS_BATCH_JOB_ARRAY_INDEX 2 AWS_BATCH_JOB_ARRAY_SIZE 8",
			"part: SLURM_ARRAY_TASK_ID says part 3/16, but AWS_BATCH_JOB_ARRAY_INDEX part 3/8"},
		{"two that disagree without a count", "auto", "JOB_COMPLETION_INDEX 2 BATCH_TASK_INDEX 1 BATCH_TASK_COUNT 4",
			"part: JOB_COMPLETION_INDEX says part 3, but BATCH_TASK_INDEX part 2/4"},
		{"two of which one is wrong", "auto", slurm(3, 1, 16, 1, 16) + " PBS_ARRAY_INDEX x", `part: PBS_ARRAY_INDEX: "x" is not a whole number`},
	} {
		p, err := ParsePart(c.text, environment(c.variables))
		if err == nil {
			if p.String() != c.want {
				t.Errorf("%s: got %s, want %s", c.about, p, c.want)
			}
			continue
		}
		var hinted interface{ Hint() string }
		if err.Error() != c.want || !errors.As(err, &hinted) || hinted.Hint() == "" || p != (Part{}) {
			t.Errorf("%s: got %q with advice %v, want %q", c.about, err, hinted, c.want)
		}
	}
}

// The processes of an array, taken together, are all parts and each once.
func TestPartsOfWholeArrays(t *testing.T) {
	const n = 12
	for engine, variables := range map[string]func(k int) string{
		"Slurm":      func(k int) string { return slurm(5+3*k, 5, 5+3*(n-1), 3, n) },
		"Kubernetes": func(k int) string { return fmt.Sprint("JOB_COMPLETION_INDEX ", k) },
		"AWS Batch": func(k int) string {
			return fmt.Sprint("AWS_BATCH_JOB_ARRAY_INDEX ", k, " AWS_BATCH_JOB_ARRAY_SIZE ", n)
		},
		"Google Cloud Batch": func(k int) string { return fmt.Sprint("BATCH_TASK_INDEX ", k, " BATCH_TASK_COUNT ", n) },
		"Cloud Run":          func(k int) string { return fmt.Sprint("CLOUD_RUN_TASK_INDEX ", k, " CLOUD_RUN_TASK_COUNT ", n) },
		"PBS":                func(k int) string { return fmt.Sprint("PBS_ARRAY_INDEX ", k+1) },
		"LSF":                func(k int) string { return fmt.Sprint("LSB_JOBINDEX ", k+1, " LSB_JOBINDEX_END ", n) },
		"Grid Engine":        func(k int) string { return gridEngine(fmt.Sprint(2+2*k), "2", fmt.Sprint(2*n), "2") },
	} {
		seen := map[Part]bool{}
		for k := range n {
			p, err := ParsePart(fmt.Sprint("auto/", n), environment(variables(k)))
			if err != nil || p.Index < 1 || p.Index > n || p.Of != n {
				t.Fatalf("%s: %v, %v", engine, p, err)
			}
			seen[p] = true
		}
		if len(seen) != n {
			t.Errorf("%s: parts %v", engine, slices.Collect(maps.Keys(seen)))
		}
	}
	if len(arrays) != 8 {
		t.Errorf("%d engines", len(arrays))
	}
}

func TestPartString(t *testing.T) {
	for p, want := range map[Part]string{{3, 16}: "3/16", {1, 1}: "1/1", {}: ""} {
		if got := p.String(); got != want {
			t.Errorf("got %q, want %q", got, want)
		}
	}
}

func TestShares(t *testing.T) {
	for _, c := range []struct {
		about string
		size  []int64
		of    int
		want  [][]int
	}{
		{"nothing", nil, 2, [][]int{nil, nil}},
		{"one part", []int64{1, 3, 2}, 1, [][]int{{0, 1, 2}}},
		{"more parts than regions", []int64{1, 3}, 3, [][]int{{1}, {0}, nil}},
		{"equal sizes go round", []int64{5, 5, 5, 5, 5}, 2, [][]int{{0, 2, 4}, {1, 3}}},
		{"nothing known of the sizes", []int64{0, 0, 0, 0}, 2, [][]int{{0, 2}, {1, 3}}},
		{"largest first", []int64{1, 2, 3, 4, 10}, 2, [][]int{{4}, {0, 1, 2, 3}}},
		// Graham's worst case for three parts, with the best 9 (5+4, 5+4, 3+3+3) and largest first 11.
		{"Graham 1969", []int64{5, 5, 4, 4, 3, 3, 3}, 3, [][]int{{0, 4, 6}, {1, 5}, {2, 3}}},
	} {
		if got := Shares(c.size, c.of); !reflect.DeepEqual(got, c.want) {
			t.Errorf("%s: got %v, want %v", c.about, got, c.want)
		}
	}
}

func heaviest(size []int64, shares [][]int) (most int64) {
	for _, share := range shares {
		var sum int64
		for _, i := range share {
			sum += size[i]
		}
		most = max(most, sum)
	}
	return most
}

// The published bound 4/3 - 1/(3m) is reached by sizes 2m-1, 2m-1, 2m-2, 2m-2, ..., m+1, m+1, m, m, m: the best is 3m and
// largest first comes to 4m-1 (Graham 1969).
func TestSharesAtTheirWorst(t *testing.T) {
	for m := 2; m <= 40; m++ {
		size := []int64{int64(m)}
		for s := m; s < 2*m; s++ {
			size = append(size, int64(s), int64(s))
		}
		if got := heaviest(size, Shares(size, m)); got != int64(4*m-1) {
			t.Errorf("%d parts: the heaviest is %d, want %d", m, got, 4*m-1)
		}
	}
}

// best returns the heaviest share of the best division, by trying all.
func best(size []int64, load []int64) int64 {
	if len(size) == 0 {
		return slices.Max(load)
	}
	least := int64(1) << 62
	for k := range load {
		load[k] += size[0]
		least = min(least, best(size[1:], load))
		load[k] -= size[0]
	}
	return least
}

func TestSharesAgainstAllDivisions(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := rapid.IntRange(1, 4).Draw(t, "parts")
		size := rapid.SliceOfN(rapid.Int64Range(0, 30), 0, 7).Draw(t, "sizes")
		got, least := heaviest(size, Shares(size, m)), best(size, make([]int64, m))
		if got < least || 3*int64(m)*got > (4*int64(m)-1)*least {
			t.Fatalf("the heaviest is %d, the best %d", got, least)
		}
	})
}

// The same rule without a heap.
func sharesSlowly(size []int64, of int) [][]int {
	shares, left := make([][]int, of), make([]bool, len(size))
	load := make([]int64, of)
	for range size {
		next := -1
		for i := range size {
			if !left[i] && (next < 0 || size[i] > size[next]) {
				next = i
			}
		}
		left[next] = true
		to := 0
		for k := range of {
			if load[k] < load[to] || load[k] == load[to] && len(shares[k]) < len(shares[to]) {
				to = k
			}
		}
		shares[to] = append(shares[to], next)
		load[to] += size[next]
	}
	for _, s := range shares {
		slices.Sort(s)
	}
	return shares
}

func TestSharesFollowTheRule(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		of := rapid.IntRange(1, 20).Draw(t, "parts")
		size := rapid.SliceOfN(rapid.OneOf(rapid.Int64Range(0, 3), rapid.Int64Range(0, 1<<40)), 0, 60).Draw(t, "sizes")
		got := Shares(size, of)
		if want := sharesSlowly(size, of); !reflect.DeepEqual(got, want) {
			t.Fatalf("got %v, want %v", got, want)
		}
		all := slices.Concat(got...)
		slices.Sort(all)
		for i, k := range all {
			if i != k {
				t.Fatalf("region %d stands where %d should", k, i)
			}
		}
		if len(got) != of || len(all) != len(size) {
			t.Fatalf("%d shares of %d regions", len(got), len(all))
		}
	})
}

func TestSharesPanicOnTheCallersFault(t *testing.T) {
	for about, call := range map[string]func(){
		"no parts": func() { Shares([]int64{1}, 0) },
		"negative": func() { Shares([]int64{1, -1}, 2) },
	} {
		func() {
			defer func() {
				if r := recover(); r != badShares {
					t.Errorf("%s: recovered %v", about, r)
				}
			}()
			call()
		}()
	}
}
