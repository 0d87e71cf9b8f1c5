package revision

import (
	"crypto/sha1"
	"errors"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"testing"

	"github.com/go-git/go-git/v5/plumbing"
	"github.com/pjbgf/sha1cd"
)

// TestCollision hashes one of two published texts that have the same SHA-1. The texts
// come with the tests of the module that finds such marks; with the head of an object
// before them nobody has published any, so that the hash is asked by itself.
func TestCollision(t *testing.T) {
	source, _ := runtime.FuncForPC(reflect.ValueOf(sha1cd.New).Pointer()).FileLine(0)
	files, err := filepath.Glob(filepath.Join(filepath.Dir(source), "test", "testdata", "files", "sha-mbles-*.bin"))
	if err != nil || len(files) != 2 {
		t.Skip("the texts are not there: ", files, err)
	}
	var hashes []plumbing.Hash
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		hashes = append(hashes, sha1.Sum(data))
		sum := newSumming()
		sum.Write(data)
		if err := checkSum(sum, hashes[0]); !errors.Is(err, errCollide) {
			t.Errorf("%s: %v", file, err)
		}
		// The same hash is asked again for other content.
		sum.Reset()
		sum.Write([]byte("another text"))
		if err := checkSum(sum, sha1.Sum([]byte("another text"))); err != nil {
			t.Error(err)
		}
	}
	if hashes[0] != hashes[1] {
		t.Error("the texts do not have the same hash")
	}
}
