package main

import (
	"context"

	"drumlin/cmd/internal/batch"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// work is what the commands have done for them. Tests of the arguments put their own functions here.
type work struct {
	run    func(ctx context.Context, s plan.Settings, dir string, ev pipeline.Events) (summary.Document, error)
	reuse  func(ctx context.Context, r pipeline.ReuseRequest, ev pipeline.Events) error
	batch  func(ctx context.Context, b *batch.Batch, out string, o batch.Options, ev batch.Events) (batch.Report, error)
	folder func(ctx context.Context, dir string, force bool, fill func(partial string) error) error
}

func realWork() work {
	return work{run: pipeline.Run, reuse: pipeline.Reuse, batch: runBatch, folder: pipeline.Folder}
}

func runBatch(ctx context.Context, b *batch.Batch, out string, o batch.Options, ev batch.Events) (batch.Report, error) {
	return b.Run(ctx, out, o, ev)
}
