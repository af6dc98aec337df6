package batch

import (
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"runtime/debug"
	"slices"
	"strings"
	"sync"
	"time"

	"drumlin/basis2d/blocks"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// Options say how a batch is carried out. Nothing in them bears on the results.
type Options struct {
	Workers int      // threads; 0 is one for each processor
	Part    Part     // the share of the regions to do; zero for all
	Gather  bool     // fit nothing: bring together what parts have done
	Redo    []string // regions to be done again though nothing has changed
}

// Events is told how far a batch is. It is called from one goroutine at a time.
type Events interface {
	// Stage names what is being done, and how much of it is; total 0 means that is not known.
	Stage(name string, done, total int)
	// Region tells what a region came to.
	Region(l Line, t Tally)
	// Note tells of something found on the way.
	Note(text string)
}

// Tally counts the regions of a run so far.
type Tally struct {
	Regions, Done                          int // of those to be done, and how many are
	Unchanged, Failed, Looks, Stops, Fresh int // Fresh: fitted in this run. Looks and Stops count unchanged ones too
	// Of those, what an earlier run had to do with them: Adopted ones are among the unchanged; the others were fitted
	// again, since something of them changed or was gone, since they had failed, or on request.
	Adopted, Changed, Retried, Redone int
	// Work is in bytes of input and a little for each region; WorkFresh was done in this run.
	WorkDone, WorkFresh, Work int64
	Since                     time.Time
}

// Report is what came of a batch.
type Report struct {
	Outcomes []Outcome // in the order of the plan; of a part, its own
	Missing  []string  // regions that a gather found neither done nor failed
	Tally    Tally
	Written  []string // files beside the regions' folders
	Notes    []string
}

// Incomplete reports whether some regions failed, are missing or carry a stop.
func (r Report) Incomplete() bool { return r.Tally.Failed+r.Tally.Stops+len(r.Missing) > 0 }

// runner is one run of a batch into a folder.
type runner struct {
	*Batch
	Options
	out    string
	events Events
	redo   map[string]bool
	sums   *fileSums
	margin *margin
	pooled *pooled
	ledger *Ledger
	past   map[string]Line // the ledger's last word on each region
	cpu    string
	host   string
	inner  int            // threads in one region
	slots  chan struct{}  // taken by regions that compute
	at     map[string]int // regions by their name

	mu    sync.Mutex
	tally Tally
}

// Run carries out the batch into the folder out: it fits what is missing, failed or changed, and unless it is a part,
// draws what needs all regions. What was done is in the report, also beside an error; the error is for what ended the
// batch as a whole: a request that cannot be, a lock, a full disk, an interrupt.
func (b *Batch) Run(ctx context.Context, out string, o Options, ev Events) (Report, error) {
	// The heap of small regions is so small that it would be collected hundreds of times a second, by goroutines that
	// take the processor from the fits. Address space that is never touched costs nothing and counts as heap: collections
	// are as far apart as its size. Measured: 500 small regions take a quarter less time on two cores.
	quiet := make([]byte, 64<<20)
	defer runtime.KeepAlive(quiet)
	r, err := b.newRun(out, o, ev)
	if err != nil {
		return Report{}, err
	}
	if err := r.prepareFolder(); err != nil {
		return Report{}, err
	}
	release, err := r.lock()
	if err != nil {
		return Report{}, err
	}
	defer release()
	if err := r.openLedger(); err != nil {
		return Report{}, err
	}
	report, err := r.run(ctx)
	err = errors.Join(err, r.ledger.Close())
	if interrupted := ctx.Err(); interrupted != nil {
		err = interrupted // whatever else came of it
	}
	return report, err
}

// newRun makes a run ready to begin, and refuses regions to redo that there are not.
func (b *Batch) newRun(out string, o Options, ev Events) (*runner, error) {
	r := &runner{Batch: b, Options: o, out: out, events: ev, sums: &fileSums{}, cpu: CPUKind(), at: map[string]int{}, redo: map[string]bool{}}
	r.host, _ = os.Hostname()
	for i, g := range r.regions {
		r.at[g.name] = i
	}
	for _, name := range r.Redo {
		if _, ok := r.at[name]; !ok {
			return nil, &fault{fmt.Sprintf("--redo %s: there is no such region in the plan", name), r.suggest(name, "name it as the plan does")}
		}
		r.redo[name] = true
	}
	return r, nil
}

func (r *runner) run(ctx context.Context) (Report, error) {
	if err := r.layMargin(ctx); err != nil {
		return Report{}, err
	}
	if err := r.poolSmoothness(ctx); err != nil {
		return Report{}, err
	}
	chosen := r.share()
	outcomes, err := r.each(ctx, chosen)
	report := Report{Tally: r.tally}
	for _, i := range chosen {
		switch o := outcomes[i]; {
		case o != nil:
			report.Outcomes = append(report.Outcomes, *o)
		case r.Gather && err == nil:
			report.Missing = append(report.Missing, r.regions[i].name)
		}
	}
	report.Notes = append(r.notes(), r.outdated(report)...)
	if err == nil && r.Part.Of == 0 {
		report.Written, err = r.draw(ctx, &report)
	}
	if !pipeline.NoRoom(err) {
		err = errors.Join(err, r.writeLedger(&report))
	}
	return report, err
}

// outdated tells of folders that earlier runs made of regions which this one has no result for.
func (r *runner) outdated(report Report) []string {
	var list []string
	look := func(name, folder string) {
		if _, err := os.Stat(filepath.Join(r.out, folder, "summary.json")); err == nil {
			list = append(list, Shown(name))
		}
	}
	for _, o := range report.Outcomes {
		if o.Status == Failed {
			look(o.Region, o.Folder)
		}
	}
	for _, name := range report.Missing {
		look(name, r.regions[r.at[name]].folder)
	}
	if list == nil {
		return nil
	}
	return []string{fmt.Sprintf("folders of earlier runs are still there for %s without a result, such as %s: they show other input or settings",
		Counted(len(list), "region"), list[0])}
}

// share lists the regions to do, ascending.
func (r *runner) share() []int {
	sizes := make([]int64, len(r.regions))
	for i, g := range r.regions {
		sizes[i] = g.size
	}
	if r.Part.Of > 0 {
		return Shares(sizes, r.Part.Of)[r.Part.Index-1]
	}
	all := make([]int, len(r.regions))
	for i := range all {
		all[i] = i
	}
	return all
}

// each does the chosen regions in parallel, the largest first, so that no large one is left to the end. The result has
// an entry for each region of the plan, nil for those that there is no word of.
func (r *runner) each(ctx context.Context, chosen []int) ([]*Outcome, error) {
	order := slices.Clone(chosen)
	slices.SortStableFunc(order, func(a, b int) int { return -cmp.Compare(r.regions[a].size, r.regions[b].size) })
	workers := blocks.Workers(r.Workers)
	r.inner = max(1, workers/max(1, len(order)))
	r.slots = make(chan struct{}, workers)
	r.tally = Tally{Regions: len(order), Since: time.Now()}
	for _, i := range order {
		r.tally.Work += r.work(i)
	}
	outcomes := make([]*Outcome, len(r.regions))
	under := workers // regions under way at a time: with one worker it is one
	if workers > 1 {
		// One more is under way than compute, as some always wait for the disk. A thread that waits there keeps a
		// processor of the scheduler's for a while, so there are more of these as well.
		under = workers + 1
		before := runtime.GOMAXPROCS(2 * workers)
		defer runtime.GOMAXPROCS(before)
	}
	err := blocks.Do(ctx, under, len(order), func(_, k int) error {
		var err error
		outcomes[order[k]], err = r.one(ctx, order[k])
		return err
	})
	return outcomes, err
}

// compute calls do when fewer than the workers compute.
func (r *runner) compute(do func() (summary.Document, error)) (summary.Document, error) {
	r.slots <- struct{}{}
	defer func() { <-r.slots }()
	return guarded(do)
}

// waiting lets another region compute while one waits for the disk.
func (r *runner) waiting(wait func() error) error {
	<-r.slots
	defer func() { r.slots <- struct{}{} }()
	return wait()
}

// work is what a region is thought to cost, for the time that is left.
func (r *runner) work(i int) int64 { return r.regions[i].size + 1000 }

// one does one region, unless its folder is there already. An error ends the batch; a failure of the region is an
// outcome.
func (r *runner) one(ctx context.Context, i int) (*Outcome, error) {
	g := r.regions[i]
	started := time.Now()
	line := Line{Region: g.name, Folder: g.folder, CPU: r.cpu, Host: r.host, Part: r.Part.String(), Version: pipeline.Version()}
	finish := func(d summary.Document, err error) (*Outcome, error) {
		line.Status, line.Reason, line.Figures = judge(d, err)
		line.Seconds, line.Ended = time.Since(started).Seconds(), time.Now().UTC()
		return r.record(i, line)
	}
	asked, settings, err := r.ask(ctx, i)
	if err == nil {
		line.Fingerprint = asked.Fingerprint
		if d, ok := r.finished(g.folder, asked.Fingerprint); ok && (!r.redo[g.name] || r.Gather) {
			return r.keep(i, line, d)
		}
		if r.Gather {
			return r.recall(i, line), nil
		}
		r.tellWhy(g)
		var d summary.Document
		asked.Waiting = r.waiting
		if d, err = r.compute(func() (summary.Document, error) {
			return r.fit(ctx, settings, asked, filepath.Join(r.out, g.folder), silent{})
		}); err == nil {
			return finish(d, nil)
		}
	}
	switch {
	case ctx.Err() != nil:
		return nil, ctx.Err()
	case pipeline.NoRoom(err):
		return nil, err
	}
	return finish(summary.Document{}, err)
}

// tellWhy counts what a region that was done before is done again for.
func (r *runner) tellWhy(g region) {
	known, ok := r.past[g.name]
	_, err := os.Stat(filepath.Join(r.out, g.folder))
	switch {
	case r.redo[g.name]:
		r.tell(&r.tally.Redone)
	case ok && known.Status == Failed:
		r.tell(&r.tally.Retried)
	case ok || err == nil:
		r.tell(&r.tally.Changed)
	}
}

func (r *runner) tell(count *int) {
	r.mu.Lock()
	defer r.mu.Unlock()
	*count++
}

// keep takes over a folder that is there already. A ledger without a line for it gets the line it lacks.
func (r *runner) keep(i int, line Line, d summary.Document) (*Outcome, error) {
	if err := pipeline.ClearUp(filepath.Join(r.out, line.Folder)); err != nil {
		return nil, err
	}
	o := &Outcome{Region: line.Region, Folder: line.Folder, Status: verdict(d), Figures: figures(d)}
	known, ok := r.past[line.Region]
	told := ok && known.Fingerprint == line.Fingerprint && known.Status != Failed
	if told && (known.Status == Unchanged || r.Gather) {
		r.count(i, o.Status, true, known)
		return o, nil
	}
	line.Status, line.Figures, line.Ended = Unchanged, o.Figures, time.Now().UTC()
	if told {
		line.Seconds, line.CPU, line.Host = known.Seconds, known.CPU, known.Host // of the run that made the folder
	} else {
		// The folder was finished and the run ended before it could say so: that word is made up for.
		line.Status, line.Reason = o.Status, "adopted: its folder was finished and the ledger had no line for it"
		r.tell(&r.tally.Adopted)
	}
	if err := r.ledger.Append(line); err != nil {
		return nil, err
	}
	r.count(i, o.Status, true, line)
	return o, nil
}

// recall is what a gather says of a region without a finished folder: why it failed, or nothing.
func (r *runner) recall(i int, line Line) *Outcome {
	known, ok := r.past[line.Region]
	if !ok || known.Status != Failed || known.Fingerprint != line.Fingerprint {
		return nil
	}
	o := Outcome{Region: line.Region, Folder: line.Folder, Status: Failed, Reason: known.Reason, Figures: noFigures()}
	r.count(i, Failed, true, known)
	return &o
}

// record puts the region into the ledger, after its folder is in place.
func (r *runner) record(i int, line Line) (*Outcome, error) {
	if err := r.ledger.Append(line); err != nil {
		return nil, err
	}
	r.count(i, line.Status, false, line)
	return &Outcome{Region: line.Region, Folder: line.Folder, Status: line.Status, Reason: line.Reason, Figures: line.Figures}, nil
}

// count counts a region and tells of it.
func (r *runner) count(i int, s Status, kept bool, line Line) {
	r.mu.Lock()
	defer r.mu.Unlock()
	t := &r.tally
	t.Done++
	t.WorkDone += r.work(i)
	switch s {
	case Failed:
		t.Failed++
	case Look:
		t.Looks++
	case Stop:
		t.Stops++
	}
	if !kept {
		t.WorkFresh += r.work(i)
	}
	switch {
	case kept && s != Failed:
		t.Unchanged++
		line.Status = Unchanged
	case s != Failed:
		t.Fresh++
	}
	r.events.Region(line, *t)
}

// judge turns a run into the ledger's words.
func judge(d summary.Document, err error) (Status, string, Figures) {
	if err != nil {
		return Failed, reason(err), noFigures()
	}
	return verdict(d), "", figures(d)
}

// verdict is the status of a region that was fitted.
func verdict(d summary.Document) Status {
	switch d.Worst() {
	case summary.Stop:
		return Stop
	case summary.Look:
		return Look
	}
	return Done
}

// reason words an error with its advice, on one line and in the keys of a plan.
func reason(err error) string {
	text := strings.ReplaceAll(err.Error(), "\n", "; ")
	var panicked *blocks.PanicError
	if errors.As(err, &panicked) {
		text += where(panicked.Stack)
	}
	var advisor interface {
		error
		Hint() string
	}
	if errors.As(err, &advisor) && advisor.Hint() != "" {
		text += " (" + advisor.Hint() + ")"
	}
	return plan.InPlan(text)
}

// where finds the line of our own code in which a panic began: for whoever is to mend it.
func where(stack []byte) string {
	_, below, _ := bytes.Cut(stack, []byte("\npanic("))
	lines := strings.Split(string(below), "\n")
	for k := 0; k+1 < len(lines); k++ {
		if strings.HasPrefix(lines[k], "drumlin/") {
			file, _, _ := strings.Cut(strings.TrimSpace(lines[k+1]), " ")
			return ", at " + filepath.Base(file)
		}
	}
	return ""
}

// guarded returns a panic of do as an error: one region's fault in our own code is not to end the others.
func guarded[T any](do func() (T, error)) (result T, err error) {
	defer func() {
		if v := recover(); v != nil {
			err = &blocks.PanicError{Value: v, Stack: debug.Stack()}
		}
	}()
	return do()
}

// silent hears nothing.
type silent struct{}

func (silent) Stage(string, int, int) {}
func (silent) Region(Line, Tally)     {}
func (silent) Note(string)            {}

// fault is a request that cannot be carried out.
type fault struct{ message, hint string }

func (f *fault) Error() string { return f.message }
func (f *fault) Hint() string  { return f.hint }
