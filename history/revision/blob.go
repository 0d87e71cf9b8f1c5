package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
)

// blobFile is an open file of a commit. An object that is stored whole is
// decompressed as it is read; one that is stored as a difference is put together
// at the first Read.
type blobFile struct {
	repo   *Repo
	what   string
	path   string
	object *object
	info   fs.FileInfo

	from   io.Reader // nil before the first Read
	z      *inflater // under from, while it is open
	loose  *os.File  // under z, while it is open
	sum    summing   // of what was read; nil where the content is checked already
	left   int64     // bytes to come
	err    error     // the end, or what went wrong
	closed bool
}

func (b *blobFile) Stat() (fs.FileInfo, error) { return b.info, nil }

// Read reads on. Instead of io.EOF it gives an error of class ErrCorrupt when the
// content does not have the hash or the length that is recorded.
func (b *blobFile) Read(to []byte) (int, error) {
	if b.closed {
		return 0, pathError("read", b.path, fs.ErrClosed)
	}
	if b.err != nil || len(to) == 0 {
		return 0, b.err
	}
	if b.from == nil {
		if err := b.begin(); err != nil {
			b.err = pathError("read", b.path, err)
			return 0, b.err
		}
	}
	// One more byte than is due is asked for, so that a surplus is noticed.
	n, err := b.from.Read(to[:min(int64(len(to)), b.left+1)])
	if int64(n) > b.left {
		n, err = int(b.left), errLength
	}
	b.left -= int64(n)
	if b.sum != nil {
		b.sum.Write(to[:n])
	}
	switch {
	case err == io.EOF && b.left > 0:
		err = errLength
	case err == io.EOF && b.sum != nil:
		if e := checkSum(b.sum, b.object.hash); e != nil {
			err = e
		}
	}
	if err != nil && err != io.EOF {
		err = pathError("read", b.path, corrupt(fmt.Sprintf("object %s cannot be read", b.object.hash), err))
	}
	b.err = err
	return n, err
}

// begin prepares the first Read.
func (b *blobFile) begin() error {
	b.left = b.object.size
	if b.object.pack == nil {
		f, err := os.Open(b.object.loose)
		if errors.Is(err, fs.ErrNotExist) {
			// It was packed since it was found.
			if b.object, err = b.repo.find(b.object.hash, b.what); err != nil {
				return err
			}
			if b.object.pack == nil {
				f, err = os.Open(b.object.loose)
			}
		}
		if err != nil {
			return unreadable(fmt.Sprintf("object %s cannot be read", b.object.hash), err)
		}
		if f != nil {
			b.loose = f
			if b.z, err = b.object.openLoose(f); err != nil {
				return corrupt(fmt.Sprintf("object %s cannot be read", b.object.hash), err)
			}
			b.from, b.sum = b.z, newSum(b.object.kind, b.object.size)
			return nil
		}
	}
	e, err := b.object.pack.entry(b.object.file, b.object.offset)
	if err == nil && !e.delta() {
		if b.z, err = inflate(b.object.file, e.data); err == nil {
			b.from, b.sum = b.z, newSum(b.object.kind, b.object.size)
			return nil
		}
	}
	if err != nil {
		return corrupt(fmt.Sprintf("object %s cannot be read", b.object.hash), err)
	}
	data, err := b.object.read()
	if err != nil {
		return err
	}
	if int64(len(data)) != b.left {
		return corrupt(fmt.Sprintf("object %s cannot be read", b.object.hash), errLength)
	}
	b.from = bytes.NewReader(data)
	return nil
}

// Close gives back what the file holds.
func (b *blobFile) Close() error {
	if b.closed {
		return pathError("close", b.path, fs.ErrClosed)
	}
	b.closed = true
	if b.z != nil {
		b.z.release()
		b.z = nil
	}
	if b.loose != nil {
		return b.loose.Close()
	}
	return nil
}
