// Package intake opens takes: it finds the file, hashes it, looks through its
// samples once, and says in the words of the slip what it holds or why it
// cannot be read.
package intake

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"benchslip/analyze"
	"benchslip/analyze/slip"
	"benchslip/capture"
	"benchslip/capture/health"
)

// Open opens the file of a take and fills in what was found: Rec, Health,
// SHA256 and Flags, or Fault when there is nothing to read. A fault names the
// file as the job does, never where it lies. The caller closes t.Rec.
//
// The error is that of ctx alone.
func Open(ctx context.Context, t *analyze.Take) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	rec, err := capture.Open(t.Path, t.CSV)
	if err != nil {
		t.Fault = fault(t, err)
		return nil
	}
	sum, err := hash(ctx, t.Path)
	if err == nil {
		t.Health, err = health.Scan(rec)
	}
	if ctx.Err() != nil {
		rec.Close()
		return ctx.Err()
	}
	if err != nil {
		rec.Close()
		t.Fault = fault(t, err)
		return nil
	}
	t.Rec, t.SHA256 = rec, sum
	openPlayed(t)
	for _, f := range append(append([]capture.Flag{}, rec.Info().Flags...), t.Health.Flags...) {
		f.Take = t.Name
		t.Flags = append(t.Flags, f)
	}
	return nil
}

// openPlayed opens the file that a take was played from, when the job names
// one. Its fault belongs to the measures that need it.
func openPlayed(t *analyze.Take) {
	if t.Played == "" {
		return
	}
	rec, err := capture.Open(t.Played, capture.Options{})
	if err != nil {
		as := *t // words for the stimulus' file, not the take's
		as.File = t.Stimulus
		t.PlayedFault = fault(&as, err)
		t.PlayedFault.Advice = "correct `stimulus`, or write the file with the stimulus command"
		return
	}
	t.PlayedRec = rec
}

// Close closes what Open opened.
func Close(t *analyze.Take) {
	if t.Rec != nil {
		t.Rec.Close()
	}
	if t.PlayedRec != nil {
		t.PlayedRec.Close()
	}
}

// fault words why a file gives no samples.
func fault(t *analyze.Take, err error) *analyze.Refusal {
	r := &analyze.Refusal{Code: analyze.Unreadable, Advice: "replace the file, or record the take again"}
	var e *capture.Error
	if errors.As(err, &e) {
		here := *e // the same fault under the name the job gives the file
		here.Path, here.Fix = t.File, ""
		r.Text = here.Error()
		if e.Fix != "" {
			r.Advice = e.Fix
		}
	} else {
		r.Text = t.File + ": " + cause(err).Error()
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		r.Code, r.Advice = analyze.MissingTake, "record it, or correct the file's name in the job"
	case errors.Is(err, capture.ErrUnsupported):
		r.Code = analyze.Unsupported
	}
	return r
}

// cause is what an error of the file system says without the path.
func cause(err error) error {
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	return err
}

// hash is the SHA-256 of a file in hexadecimal, read as a stream.
func hash(ctx context.Context, path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	h := sha256.New()
	buf := make([]byte, 1<<20)
	for {
		n, err := f.Read(buf)
		h.Write(buf[:n])
		if err == io.EOF {
			return hex.EncodeToString(h.Sum(nil)), nil
		}
		if err != nil {
			return "", err
		}
		if err := ctx.Err(); err != nil {
			return "", err
		}
	}
}

// Entry is the take as the slip lists it. What a missing or unreadable file
// does not tell is null; so is the rate of a file that does not state one.
func Entry(t *analyze.Take) slip.Take {
	e := slip.Take{
		Name: t.Name, File: t.File, Setup: t.Setup, Note: t.Note,
		Assumptions: []string{}, Flags: []slip.Flag{}, Where: map[string]string{},
	}
	if t.Gear != nil {
		e.Gear = t.Gear.Name
	}
	for _, c := range t.Where {
		e.Where[c.Key] = c.Value
		e.WhereKeys = append(e.WhereKeys, c.Key)
	}
	for _, f := range t.Flags {
		e.Flags = append(e.Flags, Flag(f))
	}
	if t.Fault != nil {
		e.Fault = t.Fault.Code + ": " + t.Fault.Text
		return e
	}
	in := t.Rec.Info()
	channels, sum, format, bytes, frames := len(in.Channels), t.SHA256, in.Format, in.Bytes, in.Frames
	e.SHA256, e.Bytes, e.Format, e.Channels, e.Frames = &sum, &bytes, &format, &channels, &frames
	if in.RateHz > 0 {
		rate, length := in.RateHz, in.DurationS()
		e.RateHz, e.DurationS = &rate, &length
	}
	e.Assumptions = append(e.Assumptions, in.Assumptions...)
	return e
}

// Flag is a flag in the words of the slip.
func Flag(f capture.Flag) slip.Flag {
	s := slip.Flag{Code: f.Code, Take: f.Take, Message: f.Message, FromS: f.FromS, ToS: f.ToS}
	if f.Channel > 0 {
		n := f.Channel
		s.Channel = &n
	}
	return s
}

// Line is a fault as one line for a terminal: what is wrong, then what to do.
func Line(r *analyze.Refusal) string {
	if r.Advice == "" {
		return r.Text
	}
	return fmt.Sprintf("%s; %s", r.Text, r.Advice)
}
