package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/chromedp/chromedp"

	"speedtrail/cmd/speedtrail/internal/demo"
)

// The pages of a trace in a real browser: they are quiet and ask the network for
// nothing, and their pictures hold text that can be read and searched.
func TestTracePages(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "net")
	if _, err := demo.Write(context.Background(), dir); err != nil {
		t.Fatal(err)
	}
	for name, args := range map[string][]string{
		"point":   {"--route", "BW3", "--at", "12.45", "--train", "ORE"},
		"stretch": {"--route", "BW1", "--from", "5", "--to", "45"},
	} {
		file := filepath.Join(t.TempDir(), name+".html")
		ctx := browser(t)
		var stderr bytes.Buffer
		if s := run(context.Background(), append([]string{"--repo", dir, "trace", "-q", "--out", file}, args...), nil, os.Stdout, &stderr); s != 0 {
			t.Fatalf("%s: status %d: %s", name, s, stderr.String())
		}
		url := "file://" + filepath.ToSlash(file)
		w := &watch{}
		w.on(t, ctx, url)
		if err := chromedp.Do(ctx, chromedp.Navigate(url)); err != nil {
			t.Fatal(name, err)
		}
		text := ask[string](t, ctx, `[...document.querySelectorAll("svg text")].map(e => e.textContent).join(" ")`)
		charts := ask[int](t, ctx, `document.querySelectorAll("svg").length`)
		body := ask[string](t, ctx, `document.body.innerText`)
		wide := ask[int](t, ctx, `document.documentElement.scrollWidth - document.documentElement.clientWidth`)
		if err := chromedp.Do(ctx, chromedp.EmulateViewport(390, 844, chromedp.EmulateMobile)); err != nil {
			t.Fatal(name, err)
		}
		if phone := ask[int](t, ctx, `document.documentElement.scrollWidth`); phone > 390 {
			t.Errorf("%s: %d wide at a width of 390", name, phone)
		}
		w.lock.Lock()
		if len(w.problems) > 0 || w.requests != 1 || wide > 0 {
			t.Errorf("%s: %v, %d requests, %d pixels wider than the window", name, w.problems, w.requests, wide)
		}
		w.lock.Unlock()
		if charts == 0 || !strings.Contains(text, "km/h") || !strings.Contains(text, "2025-03-03") {
			t.Errorf("%s: %d pictures, text %q", name, charts, text)
		}
		if !strings.Contains(body, "not a safety-approved tool") {
			t.Errorf("%s: no caution", name)
		}
	}
}
