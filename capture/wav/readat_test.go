package wav

import (
	"io"
	"math"
	"os"
	"strings"
	"sync"
	"testing"

	"benchslip/capture/recording"
)

// ramp is a 24-bit file of n frames: channel c of frame i holds a code that
// tells c and i apart.
func ramp(n, channels int) []byte {
	var v []int32
	for i := range n {
		for c := range channels {
			v = append(v, int32(i*100+c)-1<<20)
		}
	}
	return riff(chunk("fmt ", pcmFormat(1, channels, 48000, 24)), chunk("data", pack24(v...)))
}

func rampValue(i, c int) float64 { return float64(i*100+c-1<<20) / (1 << 23) }

func TestReadAtBlocks(t *testing.T) {
	const n = 50000 // several blocks of a read
	r, err := Open(store(t, ramp(n, 3)))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	for _, c := range []struct{ from, length, want int }{
		{0, 1, 1}, {0, n, n}, {0, n + 5, n}, {n - 1, 10, 1}, {n, 10, 0}, {n + 100, 1, 0}, {12345, 30000, 30000}, {7, 0, 0},
	} {
		dst := [][]float64{make([]float64, c.length), nil, make([]float64, c.length)}
		got, err := r.ReadAt(dst, int64(c.from))
		if err != nil || got != c.want {
			t.Fatalf("ReadAt(%d frames at %d) = %d, %v; want %d", c.length, c.from, got, err, c.want)
		}
		for i := range got {
			if dst[0][i] != rampValue(c.from+i, 0) || dst[2][i] != rampValue(c.from+i, 2) {
				t.Fatalf("frame %d: got %v %v", c.from+i, dst[0][i], dst[2][i])
			}
		}
	}
	if got, err := r.ReadAt(make([][]float64, 3), 0); got != 0 || err != nil {
		t.Errorf("no buffer at all: %d, %v", got, err)
	}
	for name, dst := range map[string][][]float64{
		"too few channels": make([][]float64, 2),
		"unequal lengths":  {make([]float64, 3), nil, make([]float64, 4)},
	} {
		if _, err := r.ReadAt(dst, 0); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	if _, err := r.ReadAt(make([][]float64, 3), -1); err == nil {
		t.Error("negative frame: no error")
	}
}

func TestReadAtConcurrent(t *testing.T) {
	const n = 20000
	r, err := Open(store(t, ramp(n, 2)))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	var wg sync.WaitGroup
	for g := range 8 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			dst := [][]float64{make([]float64, 333), make([]float64, 333)}
			for at := g; at < n; at += 1777 {
				k, err := r.ReadAt(dst, int64(at))
				if err != nil {
					t.Error(err)
				}
				for i := range k {
					if dst[1][i] != rampValue(at+i, 1) {
						t.Errorf("frame %d: got %v", at+i, dst[1][i])
						return
					}
				}
			}
		}()
	}
	wg.Wait()
}

// A file that another program shortens while it is open must not give zeros.
func TestShortenedWhileOpen(t *testing.T) {
	path := store(t, ramp(1000, 1))
	r, err := Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if err := os.Truncate(path, 1000); err != nil {
		t.Fatal(err)
	}
	_, err = recording.ReadAll(r)
	if err == nil || !strings.Contains(err.Error(), "shorter") {
		t.Errorf("got %v", err)
	}
}

// TestMissing: non-finite samples are NaN, listed by channel, then frame, and
// flagged with their place; finite ones beyond full scale are values.
func TestMissing(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	l := []float64{0, nan, inf, 2, -inf, 0}
	r := []float64{0, 0, 0, 0, 0, nan}
	var f64, f32 []byte
	for i := range l {
		f64 = append(f64, samples(l[i], r[i])...)
		f32 = append(f32, samples(float32(l[i]), float32(r[i]))...)
	}
	for bits, data := range map[int][]byte{32: f32, 64: f64} {
		in, x := readAll(t, riff(chunk("fmt ", pcmFormat(3, 2, 10, bits)), chunk("data", data)))
		want := []recording.Run{
			{Channel: 1, From: 1, To: 3, Why: "not a number"}, {Channel: 1, From: 4, To: 5, Why: "not a number"},
			{Channel: 2, From: 5, To: 6, Why: "not a number"},
		}
		if len(in.Missing) != len(want) {
			t.Fatalf("%d bits: missing %+v", bits, in.Missing)
		}
		for i := range want {
			if in.Missing[i] != want[i] {
				t.Errorf("%d bits: missing %+v, want %+v", bits, in.Missing[i], want[i])
			}
		}
		for i, bad := range []bool{false, true, true, false, true, false} {
			if math.IsNaN(x[0][i]) != bad {
				t.Errorf("%d bits: sample %d is %v", bits, i, x[0][i])
			}
		}
		if x[0][3] != 2 {
			t.Errorf("%d bits: got %v beyond full scale, want 2", bits, x[0][3])
		}
		if len(in.Flags) != 2 || in.Flags[0].Code != recording.Overrange || in.Flags[0].Channel != 1 ||
			*in.Flags[0].FromS != 0.1 || *in.Flags[0].ToS != 0.5 || in.Flags[1].Channel != 2 {
			t.Errorf("%d bits: flags %+v", bits, in.Flags)
		}
	}
}

// A file where every other sample is bad must not cost memory without bound,
// and its list must still cover every bad sample.
func TestMissingBounded(t *testing.T) {
	v := make([]float32, 100_000)
	for i := 1; i < len(v); i += 2 {
		v[i] = float32(math.NaN())
	}
	in, _ := readAll(t, riff(chunk("fmt ", pcmFormat(3, 1, 48000, 32)), chunk("data", samples(v...))))
	if n := len(in.Missing); n != maxRuns || in.Missing[n-1].To != int64(len(v)) {
		t.Errorf("%d runs, the last %+v", n, in.Missing[n-1])
	}
}

// hugeFile is a file of size bytes that is zero but for its head and tail.
type hugeFile struct {
	head, tail []byte
	size       int64
}

func (h hugeFile) ReadAt(b []byte, at int64) (int, error) {
	n := int(min(int64(len(b)), h.size-at))
	clear(b[:n])
	if at < int64(len(h.head)) {
		copy(b[:n], h.head[at:])
	}
	from := h.size - int64(len(h.tail))
	for i := max(0, from-at); i < int64(n); i++ {
		b[i] = h.tail[at+i-from]
	}
	if n < len(b) {
		return n, io.EOF
	}
	return n, nil
}

// Offsets beyond 2, 4 and 2^40 bytes: the last frame is where it should be.
func TestHuge(t *testing.T) {
	fm := chunk("fmt ", pcmFormat(1, 2, 96000, 24))
	for _, frames := range []int64{1<<31/6 + 7, 1<<32/6 - 100, 1<<32/6 + 7, 1 << 40} {
		data := 6 * frames
		head := riff(fm, sizedChunk("data", uint32(data), nil))
		if data > math.MaxUint32-1000 {
			head = container("RF64", ds64(0, uint64(data)), fm, sizedChunk("data", unknownSize, nil))
			le.PutUint64(head[20:], uint64(int64(len(head))+data-8))
			le.PutUint32(head[4:], unknownSize)
		} else {
			le.PutUint32(head[4:], uint32(int64(len(head))+data-8))
		}
		f := hugeFile{head: head, tail: pack24(1<<22, -1<<21), size: int64(len(head)) + data}
		r, err := newReader(f, f.size, "huge")
		if err != nil {
			t.Fatal(err)
		}
		if r.info.Frames != frames || len(r.info.Flags) > 0 {
			t.Errorf("%d frames, want %d; flags %+v", r.info.Frames, frames, r.info.Flags)
		}
		dst := [][]float64{make([]float64, 5), make([]float64, 5)}
		n, err := r.ReadAt(dst, frames-2)
		if n != 2 || err != nil || dst[0][0] != 0 || dst[0][1] != 0.5 || dst[1][1] != -0.25 {
			t.Errorf("%d frames: read %d, %v: %v", frames, n, err, dst)
		}
	}
}
