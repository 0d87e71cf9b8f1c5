package revision

import (
	"bufio"
	"bytes"
	"errors"
	"github.com/klauspost/compress/zlib"
	"io"
	"math"
	"sync"
)

// inflater is a decompressor with its buffers, for use again.
type inflater struct {
	section io.SectionReader
	buf     *bufio.Reader
	z       io.ReadCloser
}

var inflaters = sync.Pool{New: func() any {
	return &inflater{buf: bufio.NewReaderSize(nil, 4096)}
}}

// inflate begins to decompress at an offset of a file.
func inflate(f io.ReaderAt, offset int64) (*inflater, error) {
	in := inflaters.Get().(*inflater)
	in.section = *io.NewSectionReader(f, offset, math.MaxInt64-offset)
	in.buf.Reset(&in.section)
	var err error
	if in.z == nil {
		in.z, err = zlib.NewReader(in.buf)
	} else {
		err = in.z.(zlib.Resetter).Reset(in.buf, nil)
	}
	if err != nil {
		in.release()
		return nil, err
	}
	return in, nil
}

func (in *inflater) Read(b []byte) (int, error) { return in.z.Read(b) }

// release gives the decompressor back; it must not be used afterwards.
func (in *inflater) release() {
	in.section = io.SectionReader{}
	in.buf.Reset(nil)
	inflaters.Put(in)
}

// pieceInflater decompresses what is in memory.
type pieceInflater struct {
	from bytes.Reader
	z    io.ReadCloser
}

var pieceInflaters = sync.Pool{New: func() any { return &pieceInflater{} }}

// inflatePiece decompresses exactly size bytes from the beginning of a piece of a
// file. Where the piece ends too early, the file at the offset is read.
func inflatePiece(piece []byte, f io.ReaderAt, offset, size int64) ([]byte, error) {
	in := pieceInflaters.Get().(*pieceInflater)
	in.from.Reset(piece)
	var err error
	if in.z == nil {
		in.z, err = zlib.NewReader(&in.from)
	} else {
		err = in.z.(zlib.Resetter).Reset(&in.from, nil)
	}
	var data []byte
	if err == nil {
		data, err = readExactly(in.z, size)
	}
	in.from.Reset(nil)
	if in.z != nil {
		pieceInflaters.Put(in)
	}
	if errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, io.EOF) {
		return inflateAll(f, offset, size)
	}
	return data, err
}

var errLength = errors.New("length is not the one that is recorded")

// inflateAll decompresses exactly size bytes.
func inflateAll(f io.ReaderAt, offset, size int64) ([]byte, error) {
	in, err := inflate(f, offset)
	if err != nil {
		return nil, err
	}
	defer in.release()
	return readExactly(in, size)
}

// believed is how many bytes a recorded size is believed at once; more, when as many
// have arrived.
const believed = 1 << 20

// readExactly reads to the end, which must come after size bytes.
func readExactly(r io.Reader, size int64) ([]byte, error) {
	if size < 0 {
		return nil, errLength
	}
	var data []byte
	if size <= believed {
		data = make([]byte, size)
		if _, err := io.ReadFull(r, data); err != nil {
			return nil, noEOF(err)
		}
	} else {
		var b bytes.Buffer
		b.Grow(believed)
		n, err := io.Copy(&b, io.LimitReader(r, size))
		if err != nil {
			return nil, noEOF(err)
		}
		if n < size {
			return nil, io.ErrUnexpectedEOF
		}
		data = b.Bytes()
	}
	var more [1]byte
	switch n, err := io.ReadFull(r, more[:]); {
	case n > 0:
		return nil, errLength
	case err != io.EOF:
		return nil, err
	}
	return data, nil
}

// noEOF keeps an early end from being taken for a proper one.
func noEOF(err error) error {
	if err == io.EOF {
		return io.ErrUnexpectedEOF
	}
	return err
}
