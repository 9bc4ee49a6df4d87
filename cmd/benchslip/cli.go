package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"runtime/debug"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"benchslip/capture/unit"
)

// version stands on every slip and in the hash that numbers its sheets.
const version = "0.1.0"

// Exit statuses. Those of a verdict come from judge.Exit: 1 when a check
// fails, 3 when nothing fails but something is inconclusive. Of several jobs
// the worst counts: 2, then 1, then 3, then 0.
const (
	exitPass  = 0
	exitFault = 2 // could not run
)

// app is one call of the program: commands write results to out, messages to
// err, and leave their status. What is in out reaches stdout at the end, so a
// result is there whole or not at all.
type app struct {
	args   []string
	out    bytes.Buffer
	err    io.Writer
	status int
	// raw: out holds a document for a program and goes out as it is.
	raw bool
}

// usagef words a fault of the command line.
func usagef(format string, args ...any) error { return fmt.Errorf(format, args...) }

// Run runs the program with the given arguments and returns its exit status.
func Run(ctx context.Context, args []string, _ io.Reader, stdout, stderr io.Writer) (status int) {
	a := &app{args: args, err: stderr}
	defer func() {
		// A panic is a fault of ours. Whoever sits at the bench gets one line
		// of it; the rest is for those who ask.
		if r := recover(); r != nil {
			if os.Getenv("BENCHSLIP_TRACE") != "" {
				fmt.Fprintf(stderr, "%s\n", debug.Stack())
			}
			a.message("benchslip: a fault in the program itself: %v; please report it with the files", r)
			status = exitFault
		}
	}()
	if err := a.execute(ctx, args); err != nil {
		a.fault(err)
	}
	if a.out.Len() == 0 {
		return a.status
	}
	text := a.out.Bytes()
	if !a.raw {
		text = []byte(printable(string(text)))
	}
	if _, err := stdout.Write(text); err != nil {
		a.fault(fmt.Errorf("the result could not be written: %w", cause(err)))
	}
	return a.status
}

func (a *app) execute(ctx context.Context, args []string) error {
	root := a.root()
	root.SetArgs(args)
	if _, _, err := root.Find(args); err != nil { // names that are no command
		return unknownCommand(root, args)
	}
	return root.ExecuteContext(ctx)
}

// fault prints an error, which makes the status 2.
func (a *app) fault(err error) {
	a.status = exitFault
	if errors.Is(err, context.Canceled) {
		err = errors.New("interrupted, nothing was written")
	}
	var pe *fs.PathError
	if errors.As(err, &pe) && pe == err { // without the name of the system call
		err = fmt.Errorf("%s: %w", pe.Path, pe.Err)
	}
	a.message("benchslip: %v", err)
}

// maxMessage is the length of the longest message, in bytes.
const maxMessage = 990

// message prints one line to stderr. Messages are lower case without a full
// stop, name the place first, then what was found, wanted, and what to do.
func (a *app) message(format string, args ...any) {
	text := printable(strings.ReplaceAll(strings.TrimSpace(fmt.Sprintf(format, args...)), "\n", "; "))
	if len(text) > maxMessage {
		text = strings.ToValidUTF8(text[:maxMessage], "") + " ..."
	}
	fmt.Fprintln(a.err, text)
}

// root builds the command tree.
func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "benchslip",
		Short: "numbers with their uncertainty, judged, from bench recordings",
		Long: `benchslip turns recordings from the bench (WAV from a recorder, CSV from an
oscilloscope) into numbers with their uncertainty, judges them against the
limits of a job file, and writes a slip to attach to a ticket.`,
		SilenceUsage:  true,
		SilenceErrors: true,
		RunE: func(*cobra.Command, []string) error {
			return usagef("no command given; see benchslip --help")
		},
	}
	root.CompletionOptions.DisableDefaultCmd = true
	root.SetOut(&a.out)
	root.SetErr(a.err)
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error {
		if !cmd.HasParent() {
			return usagef("%s; see benchslip --help", flagFault(cmd, err))
		}
		return usagef("%s: %s; see %s --help", words(cmd), flagFault(cmd, err), cmd.CommandPath())
	})
	root.SetHelpFunc(func(cmd *cobra.Command, _ []string) { a.help(cmd) })
	root.AddCommand(a.runCommand(), a.lookCommand(), a.measureCommand(),
		a.newCommand(), a.planCommand(), a.stimulusCommand(), a.calibrateCommand(),
		a.compareCommand(), a.recheckCommand(), a.demoCommand(),
		a.completionCommand(), a.versionCommand())
	root.SetHelpCommand(a.helpCommand())
	root.InitDefaultHelpCmd()
	return root
}

// words is the command without the program's name, for messages.
func words(cmd *cobra.Command) string {
	return strings.TrimPrefix(cmd.CommandPath(), cmd.Root().Name()+" ")
}

// flagFault rewords the flag parser's errors and adds the nearest option.
func flagFault(cmd *cobra.Command, err error) string {
	text := err.Error()
	name, ok := strings.CutPrefix(text, "unknown flag: --")
	if !ok {
		if _, rest, found := strings.Cut(text, "unknown shorthand flag: "); found {
			return "unknown option " + rest
		}
		text = strings.Replace(text, "flag needs an argument", "an option needs a value", 1)
		return strings.Replace(text, "bad flag syntax", "not an option", 1)
	}
	text = "unknown option --" + name
	if near := unit.Nearest(name, optionNames(cmd)); near != "" {
		text += "; did you mean --" + near + "?"
	}
	return text
}

func unknownCommand(root *cobra.Command, args []string) error {
	name := args[0]
	for _, arg := range args {
		if !strings.HasPrefix(arg, "-") {
			name = arg
			break
		}
	}
	var names []string
	for _, c := range root.Commands() {
		names = append(names, c.Name())
	}
	if near := unit.Nearest(name, names); near != "" {
		return usagef("unknown command %q; did you mean %q?", name, near)
	}
	return usagef("unknown command %q; see benchslip --help", name)
}

// files checks that at least one file is named, and none is standard input.
func files(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) == 0 {
			return usagef("%s: no %s named; see %s --help", words(cmd), what, cmd.CommandPath())
		}
		return noStdin(cmd, args)
	}
}

func noStdin(cmd *cobra.Command, args []string) error {
	if slices.Contains(args, "-") {
		return usagef("%s: standard input (-) is not read; name a file", words(cmd))
	}
	return nil
}

// exactly checks for n arguments, named in what.
func exactly(n int, what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) != n {
			return usagef("%s: wants %s, got %d arguments; see %s --help", words(cmd), what, len(args), cmd.CommandPath())
		}
		return noStdin(cmd, args)
	}
}

// printable makes control and direction characters visible, so that no text
// out of a file can steer a terminal. Line ends and tabs stay.
func printable(s string) string {
	steers := func(r rune) bool {
		switch {
		case r == '\n' || r == '\t':
			return false
		case r < 0x20 || r >= 0x7f && r <= 0x9f:
			return true
		}
		return r == 0x200e || r == 0x200f || r >= 0x202a && r <= 0x202e || r >= 0x2066 && r <= 0x2069
	}
	if strings.IndexFunc(s, steers) < 0 {
		return s
	}
	var b strings.Builder
	for _, r := range s {
		if steers(r) {
			fmt.Fprintf(&b, "\\u%04x", r)
		} else {
			b.WriteRune(r)
		}
	}
	return b.String()
}
