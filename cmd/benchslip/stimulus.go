package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"benchslip/analyze/plan"
	"benchslip/capture"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
	"benchslip/report"
)

func (a *app) stimulusCommand() *cobra.Command {
	o := &stimulusOptions{}
	cmd := &cobra.Command{
		Use:   "stimulus JOB.toml | KIND KEY=VALUE ... --out FILE.wav",
		Short: "write the WAV files to play",
		Long: `Writes every file that the plan of a job names into the job's folder, or one file
of a KIND. A file that is there and differs is never written over. The
description stands in the file itself, where a run finds it again.

` + strings.Join(report.Wrap("Caution: "+stimulus.Caution+".", 80), "\n"),
		Example: "benchslip stimulus preamp.toml\nbenchslip stimulus sweep from=10Hz to=40kHz rate=96kHz --out sweep.wav",
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 0 {
				return usagef("stimulus: no job and no kind named; see %s --help", cmd.CommandPath())
			}
			if err := noStdin(cmd, args); err != nil {
				return err
			}
			if !strings.EqualFold(filepath.Ext(args[0]), ".toml") {
				if near := unit.Nearest(args[0], stimulusKinds()); near != "" {
					return usagef("stimulus: unknown kind %q; did you mean %q?", args[0], near)
				}
				return usagef("stimulus: %q is no kind of stimulus and no job file (.toml); there is %s", args[0], strings.Join(stimulusKinds(), ", "))
			}
			if len(args) > 1 {
				return usagef("stimulus: wants one job, got %d arguments; see %s --help", len(args), cmd.CommandPath())
			}
			if o.out != "" {
				return usagef("stimulus: --out goes with a kind; the files of a job lie where its plan says")
			}
			return a.stimuliOfJob(args[0], o.allowOutside)
		},
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.StringVarP(&o.out, "out", "o", "", "with a kind: write `FILE.wav`")
	f.BoolVar(&o.allowOutside, "allow-outside", false, "let takes lie outside the job's folder")
	for _, k := range stimulus.Kinds() {
		cmd.AddCommand(a.oneStimulus(k))
	}
	return cmd
}

type stimulusOptions struct {
	out          string
	allowOutside bool
}

func stimulusKinds() []string {
	var names []string
	for _, k := range stimulus.Kinds() {
		names = append(names, k.Name)
	}
	return names
}

func (a *app) oneStimulus(k stimulus.Kind) *cobra.Command {
	var out string
	var about strings.Builder
	fmt.Fprintf(&about, "%s\n\nkeys\n", strings.Join(report.Wrap(k.Doc+".", 80), "\n"))
	rows := [][]string{}
	for _, key := range k.Keys {
		def := ""
		if key.Default != "" {
			def = "default " + key.Default
		}
		rows = append(rows, []string{key.Name, key.Doc, def})
	}
	about.WriteString(columns(rows, "  "))
	fmt.Fprintf(&about, "\nTimes in s, ms; frequencies in Hz, kHz; levels in dBFS: those of a sine whose peak\nlies at that fraction of digital full scale.")
	cmd := &cobra.Command{Use: k.Name + " KEY=VALUE ... --out FILE.wav", Short: k.Doc, Long: about.String()}
	cmd.Flags().StringVarP(&out, "out", "o", "", "write `FILE.wav`")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := noStdin(cmd, args); err != nil {
			return err
		}
		s, err := stimulus.Parse(strings.Join(append([]string{k.Name}, args...), " "))
		if err != nil {
			return err
		}
		switch {
		case out == "":
			return usagef("%s: no file named; write --out FILE.wav", words(cmd))
		case !strings.EqualFold(filepath.Ext(out), ".wav"):
			return usagef("%s: --out %s: the name of a WAV file ends in .wav", words(cmd), out)
		}
		made, err := makeStimuli([]stimulusFile{{out, filepath.ToSlash(out), s}})
		if err != nil {
			return err
		}
		a.printStimuli(made)
		return nil
	}
	return cmd
}

// stimuliOfJob writes the files that the plan of a job names.
func (a *app) stimuliOfJob(path string, allowOutside bool) error {
	j, p, err := a.planOf(path, allowOutside)
	if j == nil || err != nil {
		return err
	}
	var list []stimulusFile
	for _, f := range plan.Files(p) {
		if f.Spec == nil {
			a.fault(usagef("%s: take %s is played it, but nothing says what is in it; state the kind and its keys for the take's `stimulus`", f.Name, f.Takes[0]))
			continue
		}
		list = append(list, stimulusFile{filepath.Join(j.Dir, filepath.FromSlash(f.Name)), f.Name, *f.Spec})
	}
	if a.status == exitFault {
		return nil
	}
	if len(list) == 0 {
		fmt.Fprintln(&a.out, "the job's takes are played nothing")
		return nil
	}
	made, err := makeStimuli(list)
	if err != nil {
		return err
	}
	a.printStimuli(made)
	return nil
}

// stimulusFile is a file to write.
type stimulusFile struct {
	path, shown string
	spec        stimulus.Spec
}

// madeStimulus is a file that is there now.
type madeStimulus struct {
	stimulusFile
	before bool // it was there, with the same bytes
}

// makeStimuli writes all files or none. Each is made under a dot name first;
// one that stands at its place already and differs stops all of them.
func makeStimuli(list []stimulusFile) (made []madeStimulus, err error) {
	var parts, folders []string
	defer func() {
		for _, p := range parts {
			os.Remove(p)
		}
		if err != nil {
			for _, d := range folders {
				os.Remove(d) // empty or it stays
			}
		}
	}()
	for _, f := range list {
		dirs, err := (publisher{}).makeDir(filepath.Dir(f.path))
		folders = append(folders, dirs...)
		if err != nil {
			return nil, err
		}
		part := filepath.Join(filepath.Dir(f.path), ".new-"+filepath.Base(f.path))
		parts = append(parts, part)
		if err := stimulus.Write(part, f.spec); err != nil {
			return nil, fmt.Errorf("%s: cannot be written: %w", f.shown, cause(err))
		}
		same, err := sameFile(part, f.path)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", f.shown, cause(err))
		}
		if same == differs {
			return nil, fmt.Errorf("%s: another file stands there and is not written over; move it away, or give the stimulus another name", f.shown)
		}
		made = append(made, madeStimulus{f, same == equal})
	}
	for i, m := range made {
		if m.before {
			continue
		}
		if err := os.Rename(parts[i], m.path); err != nil {
			return nil, fmt.Errorf("%s: cannot be written: %w", m.shown, cause(err))
		}
	}
	return made, nil
}

// What sameFile finds.
const (
	absent = iota
	equal
	differs
)

// sameFile compares a file with what may stand at another place.
func sameFile(path, there string) (int, error) {
	st, err := os.Lstat(there)
	if errors.Is(err, fs.ErrNotExist) {
		return absent, nil
	}
	if err != nil {
		return absent, err
	}
	if !st.Mode().IsRegular() {
		return differs, nil
	}
	x, err := os.Open(path)
	if err != nil {
		return absent, err
	}
	defer x.Close()
	y, err := os.Open(there)
	if err != nil {
		return absent, err
	}
	defer y.Close()
	p, q := make([]byte, 1<<16), make([]byte, 1<<16)
	for {
		n, errX := io.ReadFull(x, p)
		m, errY := io.ReadFull(y, q)
		if !bytes.Equal(p[:n], q[:m]) {
			return differs, nil
		}
		if ended(errX) && ended(errY) {
			return equal, nil
		}
		for _, e := range []error{errX, errY} {
			if e != nil && !ended(e) {
				return absent, e
			}
		}
	}
}

func ended(err error) bool { return err == io.EOF || err == io.ErrUnexpectedEOF }

func (a *app) printStimuli(made []madeStimulus) {
	for _, m := range made {
		note := ""
		if m.before {
			note = " (was there already)"
		}
		fmt.Fprintf(&a.out, "%s%s\n", report.Clean(m.shown), note)
		fmt.Fprintf(&a.out, "  signal   %s\n", m.spec)
		fmt.Fprintf(&a.out, "  length   %.6g s with its silences\n", m.spec.TotalS())
	}
	for i, l := range report.Wrap(stimulus.Caution+".", 84) {
		name := "caution"
		if i > 0 {
			name = ""
		}
		fmt.Fprintf(&a.out, "%-8s %s\n", name, l)
	}
}

// describes reads the description that stands in a stimulus file.
func describes(path string) (string, bool) {
	rec, err := capture.Open(path, capture.Options{})
	if err != nil {
		return "", false
	}
	defer rec.Close()
	s, ok := stimulus.FromInfo(rec.Info().Text)
	if !ok {
		return "", false
	}
	return s.String(), true
}

func isFile(path string) bool {
	st, err := os.Stat(path)
	return err == nil && st.Mode().IsRegular()
}
