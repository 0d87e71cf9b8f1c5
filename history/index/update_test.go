package index

import (
	"context"
	"path/filepath"
	"testing"
	"time"

	"speedtrail/history/trace"
)

// A transaction waits for that of another process, whatever is asked meanwhile.
func TestWaitWhileAsked(t *testing.T) {
	ctx := context.Background()
	file := filepath.Join(t.TempDir(), "index.db")
	open := func() *Index {
		x, err := Open(ctx, file)
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { x.Close() })
		return x
	}
	x, other := open(), open()
	key := trace.Key{Zone: "UTC"}
	if err := x.exec(ctx, "INSERT INTO version VALUES (1, zeroblob(20), 'UTC', '', '', '', NULL, NULL)"); err != nil {
		t.Fatal(err)
	}
	if err := x.renew(ctx); err != nil {
		t.Fatal(err)
	}
	b := &builder{x: x, g: &graph{}, path: ".", ids: map[trace.Key]int64{}}
	if err := b.begin(ctx); err != nil {
		t.Fatal(err)
	}
	defer b.close()
	stop, asked := make(chan struct{}), make(chan error)
	go func() {
		for {
			select {
			case <-stop:
				asked <- nil
				return
			default:
			}
			if v, err := b.Version(key); v == nil || err != nil {
				asked <- err
				return
			}
		}
	}()
	// Whether a question is under way when the transaction begins is up to chance:
	// in some of so many times, it is.
	for range 40 {
		if err := other.exec(ctx, "BEGIN IMMEDIATE"); err != nil {
			t.Fatal(err)
		}
		done := make(chan error)
		go func() { done <- b.start(ctx) }()
		time.Sleep(2 * time.Millisecond)
		if err := other.exec(ctx, "COMMIT"); err != nil {
			t.Fatal(err)
		}
		if err := <-done; err != nil {
			t.Error("it did not wait: ", err)
			break
		}
		if err := b.finish(ctx); err != nil {
			t.Fatal(err)
		}
	}
	close(stop)
	if err := <-asked; err != nil {
		t.Fatal(err)
	}
}
