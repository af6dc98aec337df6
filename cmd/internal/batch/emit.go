package batch

import (
	"bytes"
	"encoding/json"
	"fmt"
	"path"
	"strconv"
	"strings"
	"text/template"
	"unicode"
	"unicode/utf8"

	"drumlin/io/plan"
)

// logFolder is the folder, in that of the batch, that parts under Slurm write their messages to.
const logFolder = "logs"

// Job is a batch as a job file has an engine carry it out. Nothing here talks to an engine: a person submits the file.
type Job struct {
	Plan, Out string // absolute paths, with slashes, as the engine's machines see them
	Program   string // likewise, of the drumlin program
	Name      string // that the engine shows; what it does not take is left out of it
	Parts     int
	Workers   int  // processors for a part
	Pooled    bool // the plan's smoothness is pooled
}

// jobFile is a kind of job file.
type jobFile struct {
	kind, file string
	refuse     func(Job) error // what this kind cannot carry
	text       *template.Template
}

var jobFiles = []jobFile{
	{"slurm", "batch.slurm", refuseForSlurm, jobTemplate(slurmText)},
	{"kubernetes", "batch.yaml", refuseForKubernetes, jobTemplate(kubernetesText)},
}

// EmitFile returns the name that a job file of a kind should have in the folder of the batch. It is empty for a kind
// that Emit refuses.
func EmitFile(kind string) string {
	for _, f := range jobFiles {
		if f.kind == kind {
			return f.file
		}
	}
	return ""
}

// Emit returns a job file that has the batch done in parts: kind is "slurm" for a script whose array has an element a
// part, or "kubernetes" for a manifest whose Indexed Job has a completion a part. The folder logs in that of the batch
// must be there before the script is submitted. Errors carry a hint.
func Emit(kind string, j Job) ([]byte, error) {
	for _, f := range jobFiles {
		if f.kind != kind {
			continue
		}
		if err := j.check(); err != nil {
			return nil, err
		}
		if err := f.refuse(j); err != nil {
			return nil, err
		}
		var b bytes.Buffer
		err := f.text.Execute(&b, jobText{j, f.file})
		return b.Bytes(), err
	}
	return nil, unknownKind(kind)
}

func unknownKind(kind string) error {
	var kinds []string
	for _, f := range jobFiles {
		kinds = append(kinds, f.kind)
	}
	hint := "name one of these"
	if near, ok := plan.Nearest(kind, kinds); ok {
		hint = "did you mean " + near + "?"
	}
	return &fault{fmt.Sprintf("emit: %q is not one of %s", kind, strings.Join(kinds, ", ")), hint}
}

// check refuses what no job file can carry.
func (j Job) check() error {
	for _, p := range []struct{ what, path string }{{"plan", j.Plan}, {"folder", j.Out}, {"program", j.Program}} {
		switch {
		case !path.IsAbs(p.path):
			return &fault{fmt.Sprintf("emit: the %s's path %q does not begin with a slash", p.what, p.path),
				"emit the job file on a machine that sees the files under the same paths as the engine's machines"}
		case !utf8.ValidString(p.path) || strings.ContainsFunc(p.path, breaksLine):
			return &fault{fmt.Sprintf("emit: the %s's path %q holds control characters", p.what, p.path), "rename it"}
		}
	}
	switch {
	case j.Parts < 1 || j.Parts > mostParts:
		return &fault{fmt.Sprintf("emit: a batch cannot be divided into %d parts", j.Parts), fmt.Sprintf("name 1 to %d", mostParts)}
	case j.Workers < 1:
		return &fault{fmt.Sprintf("emit: a part cannot have %d workers", j.Workers), "give each part a processor or more, with --workers"}
	}
	return nil
}

// breaksLine reports whether a letter ends a line or steers a terminal, somewhere.
func breaksLine(r rune) bool {
	return unicode.IsControl(r) || r == '\u2028' || r == '\u2029'
}

// refuseForSlurm: a backslash in the name of a log file turns off the signs that stand for the part's number.
func refuseForSlurm(j Job) error {
	if strings.Contains(j.Out, `\`) {
		return &fault{fmt.Sprintf("emit: Slurm cannot name log files in %q", j.Out), "name a folder without a backslash in its path"}
	}
	return nil
}

// refuseForKubernetes: a container reaches the files through one volume, mounted on a folder that holds them all.
func refuseForKubernetes(j Job) error {
	switch mount := (jobText{Job: j}).Mount(); {
	case mount == "/":
		return &fault{fmt.Sprintf("emit: plan %q and folder %q have no folder in common that a volume could be mounted on", j.Plan, j.Out),
			"put both under one folder that lies in the volume"}
	case strings.Contains(mount, ":"):
		return &fault{fmt.Sprintf("emit: Kubernetes cannot mount a volume on %q", mount), "name a folder without a colon in its path"}
	}
	return nil
}

// jobText is a job as the templates below see it.
type jobText struct {
	Job
	file string
}

// Title returns a name that engines take: small Latin letters, digits and single hyphens, short enough to be added to.
func (j jobText) Title() string {
	words := strings.FieldsFunc(strings.ToLower(j.Name), func(r rune) bool { return (r < 'a' || r > 'z') && (r < '0' || r > '9') })
	title := strings.Join(append([]string{"drumlin"}, words...), "-")
	if title == "drumlin" {
		return "drumlin-batch"
	}
	return strings.TrimRight(title[:min(len(title), 40)], "-")
}

// Logs returns the path of the folder of the parts' messages.
func (j jobText) Logs() string { return path.Join(j.Out, logFolder) }

// File returns the path of the job file itself.
func (j jobText) File() string { return path.Join(j.Out, j.file) }

// Mount returns the deepest folder that holds the plan, and is or holds the batch's.
func (j jobText) Mount() string {
	out := path.Clean(j.Out)
	for at := path.Dir(path.Clean(j.Plan)); ; at = path.Dir(at) {
		if at == "/" || out == at || strings.HasPrefix(out, at+"/") {
			return at
		}
	}
}

// command is one of a job's commands.
type command struct {
	jobText
	Arguments []string
}

// PartCommand returns the command that does a part. It names their number, so that a few can be submitted again.
func (j jobText) PartCommand() command {
	return j.command("--part", fmt.Sprintf("auto/%d", j.Parts), "--quiet")
}

// GatherCommand returns the command that gathers the parts.
func (j jobText) GatherCommand() command { return j.command("--gather") }

func (j jobText) command(what ...string) command {
	arguments := []string{"batch", j.Plan, "--out", j.Out, "--workers", strconv.Itoa(j.Workers)}
	return command{j, append(arguments, what...)}
}

// Shell returns the command for a shell.
func (c command) Shell() string {
	words := []string{"exec", shell(c.Program)}
	for _, a := range c.Arguments {
		words = append(words, shell(a))
	}
	return strings.Join(words, " ")
}

func jobTemplate(text string) *template.Template {
	return template.Must(template.New("job").Funcs(template.FuncMap{
		"shell": shell, "directive": directive, "pattern": pattern, "yaml": inYAML, "argument": argument,
	}).Parse(text))
}

// shell quotes a word for a POSIX shell.
func shell(word string) string {
	plain := func(r rune) bool {
		return r < utf8.RuneSelf && (unicode.IsLetter(r) || unicode.IsDigit(r) || strings.ContainsRune("/._-+,:@%=", r))
	}
	if word != "" && !strings.ContainsFunc(word, func(r rune) bool { return !plain(r) }) {
		return word
	}
	return "'" + strings.ReplaceAll(word, "'", `'\''`) + "'"
}

// directive quotes a word for a line of directives to Slurm, which is not read by a shell.
func directive(word string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(word) + `"`
}

// pattern makes a path stand for itself where Slurm takes a file name with "%" signs that stand for others.
func pattern(path string) string { return strings.ReplaceAll(path, "%", "%%") }

// inYAML quotes a word for YAML, in which JSON's strings are valid.
func inYAML(word string) string {
	var b strings.Builder
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	_ = e.Encode(word) // a string always can be
	return strings.TrimSuffix(b.String(), "\n")
}

// argument quotes a word for a container's command in YAML, where Kubernetes puts variables in for $(NAME), and $ for $$.
func argument(word string) string { return inYAML(strings.ReplaceAll(word, "$", "$$")) }

const slurmText = `#!/bin/bash
#SBATCH --job-name={{.Title}}
#SBATCH --array=1-{{.Parts}}
#SBATCH --cpus-per-task={{.Workers}}
#SBATCH --signal=B:TERM@60
#SBATCH --output={{printf "%s/%%A_%%a.txt" (pattern .Logs) | directive}}
#
# A batch of regions in {{.Parts}} parts, each an element of a job array. All machines must see the plan, the files that it
# names, the program and the folder of the batch under the same paths. Lines that a cluster may ask for, with one # less:
##SBATCH --time=04:00:00
##SBATCH --mem=4G
##SBATCH --partition=
#
# Submit the parts, and the gather to follow them however they end:
#
#   parts=$(sbatch --parsable {{shell .File}})
#   sbatch --dependency=afterany:"${parts%%;*}" --job-name={{.Title}}-gather --cpus-per-task={{.Workers}} \
#     --output={{printf "%s/gather_%%j.txt" (pattern .Logs) | shell}} --wrap={{shell .GatherCommand.Shell}}
#
# The gather lists what is missing. To have parts 3 and 7 done again; what is finished and unchanged stays as it is:
#
#   sbatch --array=3,7 {{shell .File}}
#
# How a part ends: 0, all its regions are fitted; 3, it went through, but regions failed or carry a stop, which Slurm shows
# as failed and doing it again does not mend; 2, the request or the input is wrong; 130, it was interrupted. A minute
# before its time is up a part is told to stop: it ends in order, and goes on from there when it is submitted again.
{{- if gt .Parts 1000}}
#
# Slurm takes array numbers below its MaxArraySize, which is 1001 unless the cluster's administrator has set it.
{{- end}}
{{- if .Pooled}}
#
# The smoothness is pooled: the part that comes first estimates it from all regions, while the others wait for it with the
# processors they hold. To spare them that, submit one part, and the rest once pooled.json is in the folder of the batch:
#
#   sbatch --array=1 {{shell .File}}
{{- end}}

set -euo pipefail

exec {{shell .Program}} batch {{shell .Plan}} --out {{shell .Out}} --part auto/{{.Parts}} --workers "$SLURM_CPUS_PER_TASK" --quiet
`

// Exit codes 2 and 3 come again however often a part is tried; an interrupt does not, and a lost machine is no fault of
// the part's. The gather is held back until a person lets it go, since Jobs do not wait for each other.
const kubernetesText = `# A batch of regions in {{.Parts}} parts, each a completion of an Indexed Job, and a second Job that gathers them.
#
# Before it is applied: fill in the lines marked FILL IN, twice each, and look at those marked CHECK. The plan, the files
# that it names and the folder of the batch lie in one volume that many machines can write to at once (ReadWriteMany).
# It is mounted where this machine has these files: on {{.Mount}}
#
#   kubectl apply -f {{shell .File}}
#
# When the Job {{.Title}} has ended, complete or failed, let the gather go; it lists what is missing:
#
#   kubectl patch job {{.Title}}-gather --patch '{"spec":{"suspend":false}}'
#
# To have the parts done again, delete both Jobs and apply the file again: what is finished and unchanged stays as it is.
#
# How a part ends: 0, all its regions are fitted; 3, it went through, but regions failed or carry a stop, which Kubernetes
# shows as failed and trying again does not mend; 2, the request or the input is wrong; 130, it was interrupted. Only what
# trying again can mend is tried again.
{{- if .Pooled}}
#
# The smoothness is pooled: the part that comes first estimates it from all regions, while the others wait for it with the
# processors they hold. To spare them that, apply the file with parallelism 1, and raise it once pooled.json is in the
# folder of the batch:
#
#   kubectl patch job {{.Title}} --patch '{"spec":{"parallelism":{{.Parts}}}}'
{{- end}}
apiVersion: batch/v1
kind: Job
metadata:
  name: {{.Title}}
spec:
  completionMode: Indexed
  completions: {{.Parts}}
  parallelism: {{.Parts}}
  backoffLimitPerIndex: 2
  maxFailedIndexes: {{.Parts}}
  {{- template "retries" "FailIndex"}}
  {{- template "pod" .PartCommand}}
---
apiVersion: batch/v1
kind: Job
metadata:
  name: {{.Title}}-gather
spec:
  suspend: true
  backoffLimit: 2
  {{- template "retries" "FailJob"}}
  {{- template "pod" .GatherCommand}}

{{- define "retries"}}
  podFailurePolicy:
    rules:
      - action: {{.}}
        onExitCodes:
          containerName: drumlin
          operator: In
          values: [2, 3]
      - action: Ignore
        onPodConditions:
          - type: DisruptionTarget
            status: "True"
{{- end}}

{{- define "pod"}}
  template:
    spec:
      restartPolicy: Never
      containers:
        - name: drumlin
          image: FILL-IN # FILL IN: an image that holds the program
          command: [{{argument .Program}}] # CHECK: where the image has it
          args:
          {{- range .Arguments}}
            - {{argument .}}
          {{- end}}
          resources:
            requests:
              cpu: "{{.Workers}}"
              memory: 4Gi # CHECK
            limits:
              cpu: "{{.Workers}}"
              memory: 4Gi # CHECK
          volumeMounts:
            - name: files
              mountPath: {{yaml .Mount}}
      volumes:
        - name: files
          persistentVolumeClaim:
            claimName: FILL-IN # FILL IN: the claim to the volume
{{- end}}
`
