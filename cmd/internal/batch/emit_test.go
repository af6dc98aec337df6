package batch

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

func plainJob() Job {
	return Job{Plan: "/work/coast.toml", Out: "/work/out", Program: "/opt/bin/drumlin", Name: "coast", Parts: 4, Workers: 2}
}

func TestEmitRefuses(t *testing.T) {
	for _, c := range []struct {
		about, kind   string
		change        func(*Job)
		message, hint string
	}{
		{"a slip", "slrum", func(*Job) {}, `emit: "slrum" is not one of slurm, kubernetes`, "did you mean slurm?"},
		{"a capital", "Kubernetes", func(*Job) {}, `emit: "Kubernetes" is not one of slurm, kubernetes`, "did you mean kubernetes?"},
		{"something else", "cron", func(*Job) {}, `emit: "cron" is not one of slurm, kubernetes`, "name one of these"},
		{"nothing", "", func(*Job) {}, `emit: "" is not one of slurm, kubernetes`, "name one of these"},
		{"relative plan", "slurm", func(j *Job) { j.Plan = "coast.toml" },
			`emit: the plan's path "coast.toml" does not begin with a slash`, "same paths"},
		{"drive", "slurm", func(j *Job) { j.Out = `C:\out` }, `emit: the folder's path "C:\\out" does not begin with a slash`, "same paths"},
		{"no program", "kubernetes", func(j *Job) { j.Program = "" }, `emit: the program's path "" does not begin with a slash`, "same paths"},
		{"newline", "slurm", func(j *Job) { j.Plan = "/a\nb" }, `emit: the plan's path "/a\nb" holds control characters`, "rename"},
		{"carriage return", "kubernetes", func(j *Job) { j.Out = "/a\rb" }, `emit: the folder's path "/a\rb" holds control characters`, "rename"},
		{"NUL", "slurm", func(j *Job) { j.Program = "/a\x00b" }, `emit: the program's path "/a\x00b" holds control characters`, "rename"},
		{"line separator", "kubernetes", func(j *Job) { j.Out = "/a\u2028b" }, `emit: the folder's path "/a\u2028b" holds control characters`, "rename"},
		{"no UTF-8", "slurm", func(j *Job) { j.Out = "/a\xffb" }, `emit: the folder's path "/a\xffb" holds control characters`, "rename"},
		{"no parts", "slurm", func(j *Job) { j.Parts = 0 }, "emit: a batch cannot be divided into 0 parts", "1 to 100000"},
		{"too many parts", "kubernetes", func(j *Job) { j.Parts = 100_001 }, "emit: a batch cannot be divided into 100001 parts", "1 to 100000"},
		{"no workers", "slurm", func(j *Job) { j.Workers = 0 }, "emit: a part cannot have 0 workers", "--workers"},
		{"backslash in the log's name", "slurm", func(j *Job) { j.Out = `/a\b` }, `emit: Slurm cannot name log files in "/a\\b"`, "backslash"},
		{"nothing to mount", "kubernetes", func(j *Job) { j.Out = "/out" },
			`emit: plan "/work/coast.toml" and folder "/out" have no folder in common that a volume could be mounted on`, "under one folder"},
		{"colon", "kubernetes", func(j *Job) { j.Plan, j.Out = "/a:b/coast.toml", "/a:b/out" },
			`emit: Kubernetes cannot mount a volume on "/a:b"`, "colon"},
	} {
		j := plainJob()
		c.change(&j)
		text, err := Emit(c.kind, j)
		var hinted interface{ Hint() string }
		if err == nil || text != nil || err.Error() != c.message {
			t.Errorf("%s: got %q, %v, want %q", c.about, text, err, c.message)
		} else if !errors.As(err, &hinted) || !strings.Contains(hinted.Hint(), c.hint) {
			t.Errorf("%s: got advice %v, want %q", c.about, hinted, c.hint)
		}
	}
}

func TestEmitFile(t *testing.T) {
	for kind, want := range map[string]string{"slurm": "batch.slurm", "kubernetes": "batch.yaml", "cron": ""} {
		if got := EmitFile(kind); got != want {
			t.Errorf("%s: got %q, want %q", kind, got, want)
		}
		if key := fold(want); want != "" && !reserved(key) {
			t.Errorf("a region's folder could be named %s", want)
		}
	}
}

func TestJobTitle(t *testing.T) {
	for name, want := range map[string]string{
		"coast":                        "drumlin-coast",
		"Coast 2025":                   "drumlin-coast-2025",
		"--coast--":                    "drumlin-coast",
		"":                             "drumlin-batch",
		"побережье":                    "drumlin-batch",
		"Küste":                        "drumlin-k-ste",
		"a\nb: #c":                     "drumlin-a-b-c",
		strings.Repeat("long", 20):     "drumlin-longlonglonglonglonglonglonglong",
		strings.Repeat("a", 31) + "-b": "drumlin-" + strings.Repeat("a", 31),
	} {
		if got := (jobText{Job: Job{Name: name}}).Title(); got != want {
			t.Errorf("%q: got %q, want %q", name, got, want)
		}
	}
}

func TestJobMount(t *testing.T) {
	for _, c := range []struct{ plan, out, want string }{
		{"/work/coast.toml", "/work/out", "/work"},
		{"/work/plans/2025/coast.toml", "/work/out/2025", "/work"},
		{"/work/coast.toml", "/work/out/2025", "/work"},
		{"/work/out/coast.toml", "/work/out", "/work/out"},
		{"/work/out/plans/coast.toml", "/work/out", "/work/out"},
		{"/work/coast.toml", "/workshop/out", "/"},
		{"/coast.toml", "/out", "/"},
		{"/work/./coast.toml", "/work/out/", "/work"},
	} {
		if got := (jobText{Job: Job{Plan: c.plan, Out: c.out}}).Mount(); got != c.want {
			t.Errorf("%s and %s: got %s, want %s", c.plan, c.out, got, c.want)
		}
	}
}

// awkward are names of folders that a shell, Slurm, YAML or Kubernetes would read something into.
var awkward = []string{
	"plain", "two words", " ends ", "it's", `"quoted"`, "$HOME", "${HOME}", "$(date)", "$$", "`date`", "#1", "a #b", "100%", "%A_%a", "%%",
	"*?[a-z]", "a;b", "a&b", "a|b", "a>b", "~", "!x", "{a,b}", "-rf", "a=b", "key: value", "- item", "&anchor", "*alias", "{{.Out}}", "@a",
	"Ørevåg", "שדה", "🦆",
}

// bash finds the shell that Slurm's scripts are for.
func bash(t *testing.T) string {
	t.Helper()
	path, err := exec.LookPath("bash")
	if err == nil {
		return path
	}
	if os.Getenv("CI") == "true" {
		t.Fatal("bash is missing")
	}
	t.Skip("bash is missing")
	return ""
}

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(text), 0o755); err != nil {
		t.Fatal(err)
	}
}

// recorded reads the arguments that a stand-in was called with.
func recorded(t *testing.T, file string) []string {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	return strings.Split(strings.TrimSuffix(string(text), "\x00"), "\x00")
}

// drumlinStandIn and sbatchStandIn write their arguments to a file, one after the other.
const (
	drumlinStandIn = "#!/bin/sh\nprintf '%s\\0' \"$@\" >\"$RECORD\"\nexit 3\n"
	sbatchStandIn  = "#!/bin/sh\nprintf '%s\\0' \"$@\" >>\"$RECORD\"\necho '17;north'\n"
)

func TestSlurmScriptRuns(t *testing.T) {
	shell := bash(t)
	for names := range slices.Chunk(awkward, 12) {
		name := filepath.Join(names...) // one folder in another, since every process takes its time
		t.Run(names[0], func(t *testing.T) {
			dir, record := t.TempDir(), filepath.Join(t.TempDir(), "record")
			j := Job{Name: name, Parts: 12, Workers: 3, Pooled: true,
				Plan: filepath.Join(dir, name, "plan's.toml"), Out: filepath.Join(dir, name), Program: filepath.Join(dir, "programs", name)}
			text, err := Emit("slurm", j)
			if err != nil {
				t.Fatal(err)
			}
			script := filepath.Join(dir, "batch.slurm")
			write(t, script, string(text))
			write(t, j.Program, drumlinStandIn)
			write(t, filepath.Join(dir, "bin", "sbatch"), sbatchStandIn)
			environment := append(os.Environ(), "RECORD="+record, "PATH="+filepath.Join(dir, "bin")+":"+os.Getenv("PATH"))

			if out, err := exec.Command(shell, "-n", script).CombinedOutput(); err != nil {
				t.Fatalf("%v: %s", err, out)
			}
			run := exec.Command(shell, script)
			run.Env = environment
			if out, err := run.CombinedOutput(); err == nil || !strings.Contains(string(out), "SLURM_CPUS_PER_TASK") {
				t.Errorf("outside Slurm: %v: %s", err, out)
			}
			run = exec.Command(shell, script)
			run.Env = append(slices.Clip(environment), "SLURM_CPUS_PER_TASK=3")
			if out, _ := run.CombinedOutput(); run.ProcessState.ExitCode() != 3 || len(out) > 0 {
				t.Fatalf("%v: %s", run.ProcessState, out)
			}
			want := []string{"batch", j.Plan, "--out", j.Out, "--part", "auto/12", "--workers", "3", "--quiet"}
			if got := recorded(t, record); !slices.Equal(got, want) {
				t.Errorf("the part got %q, want %q", got, want)
			}
			os.Remove(record)

			run = exec.Command(shell, "-e", "-c", commandsUnder(t, string(text), "# Submit"))
			run.Env = environment
			if out, err := run.CombinedOutput(); err != nil {
				t.Fatalf("%v: %s", err, out)
			}
			got := recorded(t, record)
			wrap, _ := strings.CutPrefix(got[len(got)-1], "--wrap=")
			want = []string{"--parsable", filepath.Join(j.Out, "batch.slurm"), "--dependency=afterany:17",
				"--job-name=" + (jobText{Job: j}).Title() + "-gather", "--cpus-per-task=3",
				"--output=" + strings.ReplaceAll(j.Out, "%", "%%") + "/logs/gather_%j.txt", "--wrap=" + wrap}
			if !slices.Equal(got, want) {
				t.Errorf("sbatch got %q, want %q", got, want)
			}
			run = exec.Command("sh", "-c", wrap)
			run.Env = environment
			if out, _ := run.CombinedOutput(); run.ProcessState.ExitCode() != 3 || len(out) > 0 {
				t.Fatalf("%v: %s", run.ProcessState, out)
			}
			want = []string{"batch", j.Plan, "--out", j.Out, "--workers", "3", "--gather"}
			if got := recorded(t, record); !slices.Equal(got, want) {
				t.Errorf("the gather got %q, want %q", got, want)
			}
		})
	}
}

// commandsUnder returns the commands that the comment beginning so tells a person to type.
func commandsUnder(t *testing.T, text, heading string) string {
	t.Helper()
	_, text, _ = strings.Cut(text, "\n"+heading)
	var commands []string
	for _, line := range strings.Split(text, "\n") {
		if command, ok := strings.CutPrefix(line, "#   "); ok {
			commands = append(commands, command)
		} else if len(commands) > 0 {
			return strings.Join(commands, "\n")
		}
	}
	t.Fatalf("no commands after %q", heading)
	return ""
}

// Slurm reads these lines itself: quotes group, a backslash keeps the letter after it, "%%" is a "%" (sbatch's manual; what
// is expected here is what sbatch 22.05 read back).
func TestSlurmDirectives(t *testing.T) {
	j := plainJob()
	j.Out, j.Name = `/work/it's $HOME 100% "q" #1`, "Coast 2025"
	text, err := Emit("slurm", j)
	if err != nil {
		t.Fatal(err)
	}
	want := []string{"#!/bin/bash", "#SBATCH --job-name=drumlin-coast-2025", "#SBATCH --array=1-4", "#SBATCH --cpus-per-task=2",
		"#SBATCH --signal=B:TERM@60", `#SBATCH --output="/work/it's $HOME 100%% \"q\" #1/logs/%A_%a.txt"`, "#"}
	if got := strings.Split(string(text), "\n")[:len(want)]; !slices.Equal(got, want) {
		t.Errorf("got %q", got)
	}
	if n := strings.Count(string(text), "\n#SBATCH "); n != len(want)-2 {
		t.Errorf("%d directives", n)
	}
}

func TestJobFilesSayWhatMattersOnlyWhereItDoes(t *testing.T) {
	for _, c := range []struct {
		kind, sentence string
		change         func(*Job)
	}{
		{"slurm", "MaxArraySize", func(j *Job) { j.Parts = 1001 }},
		{"slurm", "pooled.json", func(j *Job) { j.Pooled = true }},
		{"kubernetes", "pooled.json", func(j *Job) { j.Pooled = true }},
	} {
		j := plainJob()
		without, err := Emit(c.kind, j)
		if err != nil || strings.Contains(string(without), c.sentence) {
			t.Errorf("%s: %s, %v", c.kind, c.sentence, err)
		}
		c.change(&j)
		with, err := Emit(c.kind, j)
		if err != nil || !strings.Contains(string(with), c.sentence) {
			t.Errorf("%s: no %s, %v", c.kind, c.sentence, err)
		}
	}
}

// What a part is told, ParsePart takes from the variables that Slurm and Kubernetes set.
func TestEmittedPartsAreUnderstood(t *testing.T) {
	for kind, variables := range map[string]string{
		"slurm":      slurm(3, 1, 4, 1, 4),
		"kubernetes": "JOB_COMPLETION_INDEX 2",
	} {
		text, err := Emit(kind, plainJob())
		if err != nil || !strings.Contains(string(text), "auto/4") {
			t.Fatalf("%s: %v", text, err)
		}
		if p, err := ParsePart("auto/4", environment(variables)); err != nil || p != (Part{3, 4}) {
			t.Errorf("%s: %v, %v", kind, p, err)
		}
	}
}

func ExampleEmit() {
	script, err := Emit("slurm", Job{Plan: "/work/coast.toml", Out: "/work/coast", Program: "/opt/drumlin", Name: "coast", Parts: 16, Workers: 4})
	if err != nil {
		panic(err)
	}
	lines := strings.Split(strings.TrimSpace(string(script)), "\n")
	fmt.Println(lines[1])
	fmt.Println(lines[2])
	fmt.Println(lines[len(lines)-1])
	// Output:
	// #SBATCH --job-name=drumlin-coast
	// #SBATCH --array=1-16
	// exec /opt/drumlin batch /work/coast.toml --out /work/coast --part auto/16 --workers "$SLURM_CPUS_PER_TASK" --quiet
}
