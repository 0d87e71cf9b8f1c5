package main

import (
	"os"
	"time"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"
)

// bar shows how far a long step has come, on a terminal only.
type bar struct {
	*progressbar.ProgressBar
}

// progress starts a bar and gives the function that moves it. Work that is done
// in a moment shows none.
func (a *app) progress(what string) func(done, total int) {
	f, ok := a.err.(*os.File)
	if a.quiet || !ok || !term.IsTerminal(int(f.Fd())) {
		return func(int, int) {}
	}
	begun := time.Now()
	var b *bar
	return func(done, total int) {
		if b == nil {
			if time.Since(begun) < 300*time.Millisecond || done >= total {
				return
			}
			b = &bar{progressbar.NewOptions(total,
				progressbar.OptionSetWriter(a.err),
				progressbar.OptionSetDescription(what),
				progressbar.OptionShowCount(),
				progressbar.OptionSetPredictTime(true),
				progressbar.OptionThrottle(100*time.Millisecond),
				progressbar.OptionClearOnFinish(),
			)}
			a.bar = b
		}
		// An error here could only be that of the terminal; the work goes on.
		_ = b.Set(done)
	}
}

// endProgress takes the bar off the screen.
func (a *app) endProgress() {
	if a.bar != nil {
		_ = a.bar.Clear()
		a.bar = nil
	}
}
