package main

import (
	"bytes"
	"context"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
)

// browser starts a headless browser for a test.
func browser(t *testing.T) context.Context {
	t.Helper()
	program := ""
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome", "chrome"} {
		if path, err := exec.LookPath(name); err == nil {
			program = path
			break
		}
	}
	if program == "" {
		if os.Getenv("CI") == "true" {
			t.Fatal("chromium is not installed")
		}
		t.Skip("chromium is not installed")
	}
	options := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(program), chromedp.NoSandbox, chromedp.WindowSize(1200, 900), chromedp.WSURLReadTimeout(time.Minute))
	ctx, cancel := chromedp.NewExecAllocator(context.Background(), options...)
	t.Cleanup(cancel)
	ctx, cancel = context.WithTimeout(ctx, 2*time.Minute)
	t.Cleanup(cancel)
	ctx, cancel = chromedp.NewContext(ctx)
	t.Cleanup(cancel)
	return ctx
}

// watch collects what a page must not do: write errors to the console, throw,
// or ask for anything but itself.
type watch struct {
	lock     sync.Mutex
	problems []string
	requests int
}

func (w *watch) on(t *testing.T, ctx context.Context, own string) {
	t.Helper()
	add := func(s string) {
		w.lock.Lock()
		defer w.lock.Unlock()
		w.problems = append(w.problems, s)
	}
	err := chromedp.Listen(ctx, func(event any) {
		switch e := event.(type) {
		case *runtime.EventConsoleAPICalled:
			add("console: " + string(e.Type))
		case *runtime.EventExceptionThrown:
			add("exception: " + e.ExceptionDetails.Text)
		case *log.EventEntryAdded:
			add("log: " + e.Entry.Text)
		case *network.EventRequestWillBeSent:
			if e.Request.URL != own {
				add("request: " + e.Request.URL)
			}
			w.requests++
		}
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, enable := range []func() error{
		func() error { _, err := chromedp.Call(ctx, network.Enable, network.EnableParams{}); return err },
		func() error { _, err := chromedp.Call(ctx, log.Enable, cdp.Empty{}); return err },
	} {
		if err := enable(); err != nil {
			t.Fatal(err)
		}
	}
}

// The demonstration's report in a real browser: it is quiet, it asks the network
// for nothing, it filters, and it prints.
func TestReportInBrowser(t *testing.T) {
	ctx := browser(t)
	dir := filepath.Join(t.TempDir(), "demo")
	var out, remarks bytes.Buffer
	if status := run(t.Context(), []string{"demo", dir}, nil, &out, &remarks); status != statusDone {
		t.Fatalf("status %d: %s", status, &remarks)
	}
	own := "file://" + filepath.ToSlash(filepath.Join(dir, "change-report.html"))
	var w watch
	w.on(t, ctx, own)
	// visible counts the stretches that are shown.
	const visible = `Array.from(document.querySelectorAll("article.stretch")).filter(a => a.getBoundingClientRect().height > 0).length`
	choose := func(id, value string) {
		t.Helper()
		if !ask[bool](t, ctx, `(function () { var s = document.getElementById("`+id+`"); s.value = "`+value+`"; s.dispatchEvent(new Event("change")); return s.value === "`+value+`" })()`) {
			t.Errorf("%q is no choice of %s", value, id)
		}
	}
	if err := chromedp.Do(ctx, chromedp.Navigate(own)); err != nil {
		t.Fatal(err)
	}
	title := ask[string](t, ctx, `document.title`)
	all := ask[int](t, ctx, visible)
	choose("train", "ORE")
	ore := ask[int](t, ctx, visible)
	withTrain := ask[bool](t, ctx, `Array.from(document.querySelectorAll("article.stretch")).filter(a => a.getBoundingClientRect().height > 0).every(a => a.dataset.trains.split("\n").includes("ORE"))`)
	choose("route", "BW5")
	fewer := ask[int](t, ctx, visible)
	choose("route", "")
	choose("train", "")
	again := ask[int](t, ctx, visible)
	pointer := ask[string](t, ctx, `(function () { var svg = document.querySelector("svg.chart"), b = svg.getBoundingClientRect();
		svg.dispatchEvent(new PointerEvent("pointermove", {clientX: b.left + b.width / 2, clientY: b.top + b.height / 2, bubbles: true}));
		return svg.closest("article").querySelector(".pointer").textContent })()`)
	wide := ask[int](t, ctx, `document.documentElement.scrollWidth - document.documentElement.clientWidth`)
	pdf, err := chromedp.Run(ctx, chromedp.PrintToPDF(chromedp.PDFPreferCSSPageSize(), chromedp.PDFPrintBackground()))
	if err != nil {
		t.Fatal(err)
	}
	// A link to a stretch that the filter hides shows it.
	choose("route", "BW5")
	lifted := ask[bool](t, ctx, `(function () { var a = Array.from(document.querySelectorAll("#findings a")).find(a => document.querySelector(a.getAttribute("href")).closest("article[hidden]"));
		a.click(); return document.querySelector(a.getAttribute("href")).getBoundingClientRect().height > 0 })()`)
	// On a telephone only the charts are wider than the screen, and say so.
	if err := chromedp.Do(ctx, chromedp.EmulateViewport(390, 844, chromedp.EmulateMobile)); err != nil {
		t.Fatal(err)
	}
	cutOff := ask[string](t, ctx, `Array.from(document.querySelectorAll("body *")).filter(e => !e.closest("svg") && e.getBoundingClientRect().right > innerWidth).slice(0, 5).map(e => e.tagName + "." + e.className).join(" ")`)
	phone := ask[int](t, ctx, `document.documentElement.scrollWidth`)
	cue := ask[string](t, ctx, `getComputedStyle(document.querySelector(".figure"), "::before").content`)
	w.lock.Lock()
	defer w.lock.Unlock()
	for _, p := range w.problems {
		t.Error(p)
	}
	if !lifted {
		t.Error("a link to what the filter hides leads nowhere")
	}
	if cutOff != "" || phone > 390 || !strings.Contains(cue, "wider than the screen") {
		t.Errorf("at a width of 390: the page is %d wide, cut off are %q, the charts say %q", phone, cutOff, cue)
	}
	if !strings.Contains(title, "Brackwater") {
		t.Errorf("title %q", title)
	}
	if w.requests == 0 {
		t.Error("no request was seen, not even that for the page: the check cannot fail")
	}
	if all == 0 || ore == 0 || ore >= all || fewer >= ore || again != all || !withTrain {
		t.Errorf("stretches shown: %d, with ORE %d (only its own: %v), with ORE on BW5 %d, again without filter %d", all, ore, withTrain, fewer, again)
	}
	if !strings.HasPrefix(pointer, "km ") || !strings.Contains(pointer, "before") || !strings.Contains(pointer, "after") {
		t.Errorf("the pointer shows %q", pointer)
	}
	if wide > 0 {
		t.Errorf("the page is %d pixels wider than the window", wide)
	}
	if !bytes.HasPrefix(pdf, []byte("%PDF-")) || len(pdf) < 50_000 {
		t.Errorf("the PDF is no document of several pages: %d bytes", len(pdf))
	}
}

// ask evaluates an expression in the page.
func ask[T any](t *testing.T, ctx context.Context, expression string) T {
	t.Helper()
	v, err := chromedp.Run(ctx, chromedp.Evaluate[T](expression))
	if err != nil {
		t.Fatalf("%.60s: %v", expression, err)
	}
	return v
}
