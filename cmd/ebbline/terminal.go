package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/signal"
	"sync"
	"syscall"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
	"golang.org/x/term"
)

// isTerminal says whether a writer is a terminal that a person looks at.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// interruptible is a context that ends at the first Ctrl-C, TERM or closing of
// the terminal, so that what is complete is kept; the second one ends the program
// at once. A run under nohup goes on when the terminal closes.
func (a *app) interruptible() (context.Context, func()) {
	ends := []os.Signal{os.Interrupt, syscall.SIGTERM}
	if !signal.Ignored(syscall.SIGHUP) {
		ends = append(ends, syscall.SIGHUP)
	}
	ctx, stop := signal.NotifyContext(context.Background(), ends...)
	ended := make(chan struct{})
	go func() {
		select {
		case <-ctx.Done():
			stop()
			select {
			case <-ended:
			default:
				fmt.Fprintln(a.errs, "ebbline: finishing what is in work; again to end at once")
			}
		case <-ended:
		}
	}()
	var once sync.Once
	return ctx, func() { once.Do(func() { close(ended) }); stop() }
}

// progressBar shows how many of total replicates are done, on a terminal only.
// The first result is called after each block from any worker; the second ends
// the bar.
func progressBar(w io.Writer, total int64, quiet bool) (func(done int64), func()) {
	if quiet || !isTerminal(w) {
		return nil, func() {}
	}
	p := mpb.New(mpb.WithOutput(w), mpb.WithWidth(40))
	bar := p.New(total, mpb.BarStyle().Lbound("[").Filler("=").Tip(">").Padding(" ").Rbound("]"),
		mpb.BarRemoveOnComplete(),
		mpb.PrependDecorators(decor.Name("replicates ")),
		mpb.AppendDecorators(decor.CountersNoUnit("%d of %d"), decor.Name("  "), decor.OnComplete(decor.AverageETA(decor.ET_STYLE_GO), "")))
	return func(done int64) { bar.SetCurrent(done) }, func() {
		bar.Abort(true)
		p.Wait()
	}
}
