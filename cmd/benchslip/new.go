package main

import (
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"benchslip/capture/unit"
	"benchslip/cmd/benchslip/internal/templates"
)

func (a *app) newCommand() *cobra.Command {
	var kinds []string
	var list strings.Builder
	for _, k := range templates.Kinds() {
		kinds = append(kinds, k.Name)
		fmt.Fprintf(&list, "\n  %-14s %s", k.Name, k.Doc)
	}
	cmd := &cobra.Command{
		Use:   "new KIND DIR",
		Short: "write a commented job folder to start from",
		Long: `Writes a new folder DIR with a commented job file to edit: gear to fill in, takes
with their conditions, checks with example limits, places for meter readings,
and the cautions of the work. KIND is one of
` + list.String(),
		Example:   "benchslip new preamp sp-017",
		ValidArgs: kinds,
		Args:      exactly(2, "a kind ("+strings.Join(kinds, ", ")+") and a folder"),
	}
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		known := false
		for _, k := range kinds {
			known = known || k == args[0]
		}
		if !known {
			if near := unit.Nearest(args[0], kinds); near != "" {
				return usagef("new: unknown kind %q; did you mean %q?", args[0], near)
			}
			return usagef("new: unknown kind %q; there is %s", args[0], strings.Join(kinds, ", "))
		}
		path, err := templates.Write(args[0], args[1])
		if err != nil {
			return fmt.Errorf("new: %w", err)
		}
		shown := filepath.ToSlash(path)
		fmt.Fprintf(&a.out, "%s\n  edit it: gear, readings, limits (all of them are examples), then\n  benchslip plan %s\n", shown, shown)
		return nil
	}
	return cmd
}
