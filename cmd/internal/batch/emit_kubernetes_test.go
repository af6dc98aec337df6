package batch

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"regexp"
	"slices"
	"strings"
	"testing"

	"github.com/goccy/go-yaml"
)

// apiReference is testdata/kubernetes/job-v1.json.
type apiReference struct {
	Objects map[string]struct{ Fields []apiField }
	Scalars map[string]struct {
		Type   string
		Values []string
	}
}

type apiField struct {
	Name, Type string
	Required   bool
}

func readReference(t *testing.T) apiReference {
	t.Helper()
	text, err := os.ReadFile("testdata/kubernetes/job-v1.json")
	if err != nil {
		t.Fatal(err)
	}
	var r apiReference
	if err := json.Unmarshal(text, &r); err != nil {
		t.Fatal(err)
	}
	return r
}

// fields returns an object's fields, those of the objects that it takes in included.
func (r apiReference) fields(object string) (list []apiField) {
	for _, f := range r.Objects[object].Fields {
		if f.Name == "" {
			list = append(list, r.fields(f.Type)...)
		} else {
			list = append(list, f)
		}
	}
	return list
}

// quantity matches an amount of a resource, as far as it is needed here (Kubernetes' reference, "Quantity"; from memory).
var quantity = regexp.MustCompile(`^[0-9]+(\.[0-9]+)?(m|[kMGTPE]|[KMGTPE]i)?$`)

// faults lists how a value read from YAML differs from a type of the reference.
func (r apiReference) faults(at, kind string, v any) []string {
	if item, ok := strings.CutPrefix(kind, "[]"); ok {
		return r.listFaults(at, item, v)
	}
	if rest, ok := strings.CutPrefix(kind, "map["); ok {
		key, item, _ := strings.Cut(rest, "]")
		return r.mapFaults(at, key, item, v)
	}
	if _, ok := r.Objects[kind]; ok {
		return r.objectFaults(at, kind, v)
	}
	if named, ok := r.Scalars[kind]; ok {
		list := r.faults(at, named.Type, v)
		if len(list) == 0 && len(named.Values) > 0 && !slices.Contains(named.Values, v.(string)) {
			return []string{fmt.Sprintf("%s: %v is not one of %v", at, v, named.Values)}
		}
		return list
	}
	text, isText := v.(string)
	_, isWhole := v.(uint64)
	_, isBool := v.(bool)
	fits := map[string]bool{"string": isText, "bool": isBool, "int32": isWhole, "int64": isWhole, "Quantity": isText && quantity.MatchString(text)}
	if !fits[kind] {
		return []string{fmt.Sprintf("%s: %v is no %s", at, v, kind)}
	}
	return nil
}

func (r apiReference) listFaults(at, item string, v any) (all []string) {
	list, ok := v.([]any)
	if !ok {
		return []string{fmt.Sprintf("%s: %v is no list", at, v)}
	}
	for i, v := range list {
		all = append(all, r.faults(fmt.Sprintf("%s[%d]", at, i), item, v)...)
	}
	return all
}

func (r apiReference) mapFaults(at, key, item string, v any) (all []string) {
	m, ok := v.(map[string]any)
	if !ok {
		return []string{fmt.Sprintf("%s: %v is no mapping", at, v)}
	}
	for name, v := range m {
		all = append(all, r.faults(at+"."+name+" (key)", key, name)...)
		all = append(all, r.faults(at+"."+name, item, v)...)
	}
	return all
}

func (r apiReference) objectFaults(at, object string, v any) (all []string) {
	m, ok := v.(map[string]any)
	if !ok {
		return []string{fmt.Sprintf("%s: %v is no mapping", at, v)}
	}
	known := map[string]bool{}
	for _, f := range r.fields(object) {
		known[f.Name] = true
		v, given := m[f.Name]
		switch {
		case given:
			all = append(all, r.faults(at+"."+f.Name, f.Type, v)...)
		case f.Required:
			all = append(all, fmt.Sprintf("%s: %s is missing", at, f.Name))
		}
	}
	for name := range m {
		if !known[name] {
			all = append(all, fmt.Sprintf("%s: %s is not a field of %s", at, name, object))
		}
	}
	return all
}

// manifests reads YAML documents.
func manifests(t *testing.T, text string) (list []map[string]any) {
	t.Helper()
	d := yaml.NewDecoder(strings.NewReader(text))
	for {
		var m map[string]any
		err := d.Decode(&m)
		if errors.Is(err, io.EOF) {
			return list
		}
		if err != nil {
			t.Fatalf("%v in\n%s", err, text)
		}
		list = append(list, m)
	}
}

func kubernetesJobs(t *testing.T, j Job) (parts, gather map[string]any) {
	t.Helper()
	text, err := Emit("kubernetes", j)
	if err != nil {
		t.Fatal(err)
	}
	list := manifests(t, string(text))
	if len(list) != 2 {
		t.Fatalf("%d documents", len(list))
	}
	return list[0], list[1]
}

// in follows keys and, where a list stands, takes its first item.
func in(t *testing.T, v any, keys ...string) any {
	t.Helper()
	for _, key := range keys {
		if list, ok := v.([]any); ok && len(list) > 0 {
			v = list[0]
		}
		m, ok := v.(map[string]any)
		if !ok {
			t.Fatalf("%v has no %s", v, key)
		}
		v = m[key]
	}
	return v
}

func TestKubernetesManifestAgainstTheReference(t *testing.T) {
	r := readReference(t)
	for _, pooled := range []bool{false, true} {
		j := plainJob()
		j.Pooled = pooled
		parts, gather := kubernetesJobs(t, j)
		for name, m := range map[string]map[string]any{"parts": parts, "gather": gather} {
			if list := r.faults(name, "Job", m); len(list) > 0 {
				t.Error(strings.Join(list, "\n"))
			}
			if m["apiVersion"] != "batch/v1" || m["kind"] != "Job" {
				t.Errorf("%s: %v %v", name, m["apiVersion"], m["kind"])
			}
		}
	}
}

// A comparison that finds nothing must be able to.
func TestTheReferenceFindsWhatIsWrong(t *testing.T) {
	r := readReference(t)
	text, err := Emit("kubernetes", plainJob())
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ old, new, want string }{
		{"completionMode:", "completionmode:", "completionmode is not a field of JobSpec"},
		{"completionMode: Indexed", "completionMode: indexed", "indexed is not one of [NonIndexed Indexed]"},
		{"parallelism: 4", `parallelism: "4"`, "parallelism: 4 is no int32"},
		{"suspend: true", "suspend: 1", "suspend: 1 is no bool"},
		{`status: "True"`, "status: true", "status: true is no string"},
		{"operator: In\n", "\n", "operator is missing"},
		{"values: [2, 3]", "values: 2", "values: 2 is no list"},
		{"action: FailIndex", "action: Fail", "Fail is not one of"},
		{"restartPolicy: Never", "restartPolicy: Sometimes", "Sometimes is not one of"},
		{"type: DisruptionTarget", "type: Disruption", "Disruption is not one of"},
		{"cpu:", "cpus:", "cpus is not one of"},
		{"memory: 4Gi", "memory: 4 GB", "4 GB is no Quantity"},
		{"mountPath: ", "path: ", "mountPath is missing"},
		{"claimName: ", "claim: ", "claim is not a field of PersistentVolumeClaimVolumeSource"},
		{"        - name: drumlin\n", "        - tty: false\n", "name is missing"},
	} {
		changed := strings.ReplaceAll(string(text), c.old, c.new)
		var found []string
		for _, m := range manifests(t, changed) {
			found = append(found, r.faults("job", "Job", m)...)
		}
		if changed == string(text) || !strings.Contains(strings.Join(found, "\n"), c.want) {
			t.Errorf("%q for %q: found %q, want %q", c.new, c.old, found, c.want)
		}
	}
}

// Rules between fields, which the reference states in words.
func TestKubernetesManifestKeepsRulesBetweenFields(t *testing.T) {
	for _, n := range []int{1, 4, 100_000} {
		j := plainJob()
		j.Parts, j.Name = n, strings.Repeat("coast ", 20)
		parts, gather := kubernetesJobs(t, j)
		for _, key := range []string{"completions", "parallelism", "maxFailedIndexes"} {
			if got := in(t, parts, "spec", key); got != uint64(n) {
				t.Errorf("%s is %v", key, got)
			}
		}
		for _, m := range []map[string]any{parts, gather} {
			// With an index behind it the name is a host's, which has at most 63 letters (RFC 1123).
			host := fmt.Sprintf("%v-%d", in(t, m, "metadata", "name"), n-1)
			if !regexp.MustCompile(`^[a-z]([a-z0-9-]*[a-z0-9])?$`).MatchString(host) || len(host) > 63 {
				t.Errorf("host %s", host)
			}
			pod := in(t, m, "spec", "template", "spec")
			rules := in(t, m, "spec", "podFailurePolicy", "rules")
			if got := in(t, pod, "restartPolicy"); got != "Never" {
				t.Errorf("with a failure policy, pods are started again %v", got)
			}
			if got, want := in(t, rules, "onExitCodes", "containerName"), in(t, pod, "containers", "name"); got != want {
				t.Errorf("exit codes of %v, container %v", got, want)
			}
			if got, want := in(t, pod, "containers", "volumeMounts", "name"), in(t, pod, "volumes", "name"); got != want {
				t.Errorf("volume %v, mounted %v", want, got)
			}
			if got := fmt.Sprint(in(t, rules, "onExitCodes", "values")); got != "[2 3]" { // ascending, without 0
				t.Errorf("exit codes %s", got)
			}
			if got, want := in(t, pod, "containers", "resources", "requests", "cpu"), fmt.Sprint(j.Workers); got != want {
				t.Errorf("%v processors", got)
			}
		}
		if in(t, parts, "metadata", "name") == in(t, gather, "metadata", "name") || in(t, gather, "spec", "suspend") != true {
			t.Error("the gather does not wait for its turn")
		}
	}
}

// expanded does what Kubernetes does to a container's command: "$(NAME)" is a variable, "$$" is "$" (k8s.io/api v0.34.0,
// core/v1, Container).
func expanded(word string) string {
	return regexp.MustCompile(`\$\$|\$\([^)]*\)`).ReplaceAllStringFunc(word, func(s string) string {
		if s == "$$" {
			return "$"
		}
		return "a variable"
	})
}

func TestKubernetesCommandsArrive(t *testing.T) {
	for _, name := range append([]string{`a\b`}, awkward...) {
		j := Job{Plan: "/" + name + "/" + name + ".toml", Out: "/" + name + "/x/" + name, Program: "/" + name, Name: name, Parts: 12, Workers: 3}
		if strings.Contains(name, ":") {
			j.Plan, j.Out = "/work/"+name+".toml", "/work/"+name
		}
		parts, gather := kubernetesJobs(t, j)
		for _, c := range []struct {
			job  map[string]any
			want []string
		}{
			{parts, []string{j.Program, "batch", j.Plan, "--out", j.Out, "--workers", "3", "--part", "auto/12", "--quiet"}},
			{gather, []string{j.Program, "batch", j.Plan, "--out", j.Out, "--workers", "3", "--gather"}},
		} {
			container := in(t, c.job, "spec", "template", "spec", "containers")
			var got []string
			for _, v := range append(in(t, container, "command").([]any), in(t, container, "args").([]any)...) {
				got = append(got, expanded(v.(string)))
			}
			if !slices.Equal(got, c.want) {
				t.Errorf("got %q, want %q", got, c.want)
			}
			mount := in(t, container, "volumeMounts", "mountPath").(string)
			if !strings.HasPrefix(j.Plan, mount+"/") || !strings.HasPrefix(j.Out, mount+"/") {
				t.Errorf("mounted on %s", mount)
			}
		}
	}
}

func TestKubernetesManifestMarksWhatItCannotKnow(t *testing.T) {
	text, err := Emit("kubernetes", plainJob())
	if err != nil {
		t.Fatal(err)
	}
	var marked []string
	for _, line := range strings.Split(string(text), "\n") {
		if value, _, ok := strings.Cut(line, " # FILL IN: "); ok {
			marked = append(marked, strings.TrimSpace(value))
		}
	}
	want := []string{"image: FILL-IN", "claimName: FILL-IN", "image: FILL-IN", "claimName: FILL-IN"}
	if !slices.Equal(marked, want) || strings.Count(string(text), "FILL-IN") != len(want) {
		t.Errorf("marked %q", marked)
	}
}
