package main

import (
	"fmt"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"benchslip/report"
)

// help prints what a command does, how it is written, and its options.
func (a *app) help(cmd *cobra.Command) {
	out := &a.out
	line := "benchslip COMMAND ..."
	if cmd.HasParent() {
		line = cmd.Parent().CommandPath() + " " + cmd.Use
	}
	fmt.Fprintf(out, "%s\n\n", line)
	about := cmd.Long
	if about == "" {
		about = cmd.Short
	}
	fmt.Fprintf(out, "%s\n", strings.TrimSpace(about))
	if cmd.Example != "" {
		fmt.Fprintf(out, "\nfor example\n%s\n", indent(cmd.Example))
	}
	if subs := cmd.Commands(); len(subs) > 0 {
		title := "commands"
		if cmd.HasParent() {
			title = "names"
		}
		fmt.Fprintf(out, "\n%s\n", title)
		width := 0
		for _, c := range subs {
			width = max(width, len(c.Name()))
		}
		for _, c := range subs {
			if !c.Hidden {
				fmt.Fprintf(out, "  %-*s  %s\n", width, c.Name(), c.Short)
			}
		}
	}
	if options := optionLines(cmd); len(options) > 0 {
		fmt.Fprintf(out, "\noptions\n")
		for _, o := range options {
			fmt.Fprintf(out, "  %s\n", o)
		}
	}
	if !cmd.HasParent() {
		fmt.Fprintf(out, `
exit status of run and measure: 0 nothing fails and nothing is open, 1 at least
one check fails, 2 could not run, 3 nothing fails but something is inconclusive
`)
	}
}

// valueOf marks an option with what its value looks like; others have it in
// back quotes in their text.
const valueOf = "benchslip-value"

// optionLines lays the options out in two columns, in the order in which they
// were made.
func optionLines(cmd *cobra.Command) []string {
	var left, right []string
	width := 0
	cmd.LocalFlags().VisitAll(func(f *pflag.Flag) {
		if f.Hidden || f.Name == "help" {
			return
		}
		name := "--" + f.Name
		if f.Shorthand != "" {
			name = "-" + f.Shorthand + ", " + name
		}
		value, about := pflag.UnquoteUsage(f)
		if v, ok := f.Annotations[valueOf]; ok {
			value = v[0]
		}
		if value != "" {
			name += " " + value
		}
		width = max(width, len(name))
		left, right = append(left, name), append(right, about)
	})
	var lines []string
	for i := range left {
		for j, part := range report.Wrap(right[i], max(40, helpWidth-width)) {
			if j > 0 {
				left[i] = ""
			}
			lines = append(lines, fmt.Sprintf("%-*s  %s", width, left[i], part))
		}
	}
	return lines
}

// helpWidth is where help texts wrap.
const helpWidth = 96

func optionNames(cmd *cobra.Command) []string {
	var names []string
	cmd.Flags().VisitAll(func(f *pflag.Flag) { names = append(names, f.Name) })
	return names
}

func indent(text string) string {
	return "  " + strings.ReplaceAll(strings.TrimSpace(text), "\n", "\n  ")
}

func (a *app) helpCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "help [COMMAND ...]",
		Short: "show what a command does and its options",
		RunE: func(cmd *cobra.Command, args []string) error {
			about := cmd.Root()
			for _, name := range args {
				var next *cobra.Command
				for _, c := range about.Commands() {
					if c.Name() == name {
						next = c
					}
				}
				if next == nil {
					return unknownTopic(about, name)
				}
				about = next
			}
			a.help(about)
			return nil
		},
	}
}

func unknownTopic(under *cobra.Command, name string) error {
	if under.HasParent() {
		return usagef("help: %s has nothing called %q; see %s --help", words(under), name, under.CommandPath())
	}
	return unknownCommand(under, []string{name})
}

func (a *app) versionCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "print the version",
		Args:  exactly(0, "no arguments"),
		RunE: func(*cobra.Command, []string) error {
			fmt.Fprintf(&a.out, "benchslip %s\n", version)
			return nil
		},
	}
}

func (a *app) completionCommand() *cobra.Command {
	shells := []string{"bash", "zsh", "fish", "powershell"}
	return &cobra.Command{
		Use:   "completion SHELL",
		Short: "print the completion script of a shell",
		Long: `Prints the completion script of a shell: ` + strings.Join(shells, ", ") + `.
Load it from the shell's own start-up file.`,
		Example:   `benchslip completion bash > ~/.local/share/bash-completion/completions/benchslip`,
		ValidArgs: shells,
		Args:      exactly(1, "one shell of "+strings.Join(shells, ", ")),
		RunE: func(cmd *cobra.Command, args []string) error {
			a.raw = true
			root := cmd.Root()
			switch args[0] {
			case "bash":
				return root.GenBashCompletionV2(&a.out, true)
			case "zsh":
				return root.GenZshCompletion(&a.out)
			case "fish":
				return root.GenFishCompletion(&a.out, true)
			case "powershell":
				return root.GenPowerShellCompletionWithDesc(&a.out)
			}
			a.raw = false
			return usagef("completion: no script for %q; there is one for %s", args[0], strings.Join(shells, ", "))
		},
	}
}
