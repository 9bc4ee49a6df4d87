package main

import (
	"archive/zip"
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/spf13/pflag"

	"benchslip/analyze/job"
	"benchslip/analyze/slip"
	"benchslip/report/renderers"
)

// A bundle is the whole slip as one file for a ticket: the slip's files, the
// job and what it includes, and the hashes of the takes. The same slip gives
// the same bytes: entries stand in a fixed order and carry no date.
type bundleOptions struct {
	file  string
	limit string
	takes bool
	bytes int64  // limit
	done  string // what was written, in one line
}

// bundleLimit is what ticket systems commonly take (common practice, no
// source: 5 MB).
const bundleLimit = "5 MB"

func (o *bundleOptions) add(f *pflag.FlagSet) {
	f.StringVar(&o.file, "bundle", "", "pack the slip, the job and the takes' hashes into `FILE.zip` as well")
	f.StringVar(&o.limit, "bundle-limit", bundleLimit, "largest `SIZE` of the bundle, like \"5 MB\"; figures are left out first")
	f.BoolVar(&o.takes, "bundle-takes", false, "put the takes themselves into the bundle")
}

func (o *bundleOptions) check(several bool) error {
	if o.file == "" {
		if o.takes {
			return usagef("run: --bundle-takes goes with --bundle FILE.zip")
		}
		return nil
	}
	if several {
		return usagef("run: --bundle packs one slip; run the jobs one by one")
	}
	if !strings.EqualFold(filepath.Ext(o.file), ".zip") {
		return usagef("run: --bundle %s: the name of a bundle ends in .zip", o.file)
	}
	n, err := sizeOf(o.limit)
	if err != nil {
		return usagef("run: --bundle-limit %q: expected a size, like \"5 MB\"", o.limit)
	}
	o.bytes = n
	return nil
}

// sizeOf reads "5 MB", "500 kB", "2000000".
func sizeOf(text string) (int64, error) {
	s := strings.TrimSpace(text)
	factor := 1.0
	for _, u := range []struct {
		name   string
		factor float64
	}{{"kB", 1e3}, {"KB", 1e3}, {"MB", 1e6}, {"GB", 1e9}, {"B", 1}} {
		if number, ok := strings.CutSuffix(s, u.name); ok {
			s, factor = strings.TrimSpace(number), u.factor
			break
		}
	}
	x, err := strconv.ParseFloat(s, 64)
	if err != nil || !(x > 0 && x*factor < 1e15) {
		return 0, fmt.Errorf("no size")
	}
	return int64(x * factor), nil
}

// hashList is the file of a bundle that holds the takes' hashes, in the form
// that sha256 checkers read.
const hashList = "takes.sha256"

// write packs a bundle. Figures are left out when it would grow over the
// limit; what else does not fit is an error, and nothing is written.
func (o *bundleOptions) write(ctx context.Context, s *slip.Slip, j *job.Job, files []renderers.File, redacted bool) error {
	var core, figures []renderers.File
	for _, f := range files {
		if strings.HasPrefix(f.Name, "plots/") {
			figures = append(figures, f)
		} else {
			core = append(core, f)
		}
	}
	core = append(core, renderers.File{Name: hashList, Data: hashesOf(s)})
	if !redacted { // the job says what the slip withholds
		for i, src := range j.Sources {
			name := src.Name
			if i == 0 {
				name = filepath.Base(filepath.FromSlash(name))
			}
			if filepath.IsLocal(filepath.FromSlash(name)) {
				core = append(core, renderers.File{Name: "job/" + name, Data: src.Data})
			}
		}
	}
	tmp := filepath.Join(filepath.Dir(o.file), ".new-"+filepath.Base(o.file))
	defer os.Remove(tmp)
	size, left, err := int64(0), "", error(nil)
	for _, list := range [][]renderers.File{append(append([]renderers.File{}, core...), figures...), core} {
		if size, err = o.pack(ctx, tmp, list, s, j); err != nil {
			return err
		}
		if size <= o.bytes {
			break
		}
		left = fmt.Sprintf(" without its %d figure files", len(figures))
	}
	if size > o.bytes {
		what := "the slip"
		if o.takes {
			what = "the slip with its takes"
		}
		return fmt.Errorf("%s: %s takes %d bytes packed, more than the %d of --bundle-limit; the slip itself is written", o.file, what, size, o.bytes)
	}
	if err := os.Rename(tmp, o.file); err != nil {
		return fmt.Errorf("%s: cannot be written: %w", o.file, cause(err))
	}
	o.done = fmt.Sprintf("bundle %s, %d bytes%s", filepath.ToSlash(o.file), size, left)
	return nil
}

// hashesOf lists the takes that could be read.
func hashesOf(s *slip.Slip) []byte {
	var b bytes.Buffer
	for _, t := range s.Takes {
		if t.SHA256 != nil {
			fmt.Fprintf(&b, "%s  %s\n", *t.SHA256, strings.NewReplacer("\n", " ", "\r", " ").Replace(t.File))
		}
	}
	return b.Bytes()
}

// pack writes one zip file and returns its size.
func (o *bundleOptions) pack(ctx context.Context, path string, files []renderers.File, s *slip.Slip, j *job.Job) (int64, error) {
	fault := func(err error) (int64, error) {
		return 0, fmt.Errorf("%s: cannot be written: %w", o.file, cause(err))
	}
	f, err := os.Create(path)
	if err != nil {
		return fault(err)
	}
	defer f.Close()
	z := zip.NewWriter(f)
	seen := map[string]bool{}
	entry := func(name string) (io.Writer, error) {
		seen[name] = true
		// No date: a zip without one shows 1980-01-01 or none.
		return z.CreateHeader(&zip.FileHeader{Name: name, Method: zip.Deflate})
	}
	for _, file := range files {
		w, err := entry(file.Name)
		if err == nil {
			_, err = w.Write(file.Data)
		}
		if err != nil {
			return fault(err)
		}
	}
	if o.takes {
		for i, t := range j.Takes {
			sum := s.Takes[i].SHA256
			name := "job/" + t.File
			if sum == nil || seen[name] {
				continue
			}
			if !filepath.IsLocal(filepath.FromSlash(t.File)) {
				name = "job/takes/" + filepath.Base(filepath.FromSlash(t.File))
			}
			if err := ctx.Err(); err != nil {
				return 0, err
			}
			w, err := entry(name)
			if err != nil {
				return fault(err)
			}
			if err := copyTake(w, t.Path, *sum); err != nil {
				return 0, fmt.Errorf("%s: %w", t.File, err)
			}
		}
	}
	if err := z.Close(); err != nil {
		return fault(err)
	}
	st, err := f.Stat()
	if err != nil {
		return fault(err)
	}
	return st.Size(), nil
}

// copyTake copies a recording and sees that it is still the one that was
// measured.
func copyTake(w io.Writer, path, sum string) error {
	f, err := os.Open(path)
	if err != nil {
		return cause(err)
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(io.MultiWriter(w, h), f); err != nil {
		return cause(err)
	}
	if hex.EncodeToString(h.Sum(nil)) != sum {
		return fmt.Errorf("changed while the slip was made; run it again")
	}
	return nil
}
