package main

import (
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"

	"benchslip/cmd/benchslip/internal/sim"
)

func (a *app) demoCommand() *cobra.Command {
	o := &runOptions{}
	cmd := &cobra.Command{
		Use:   "demo DIR",
		Short: "write the demo jobs with simulated recordings, and run them",
		Long: `Writes two jobs with their recordings into DIR and runs them: a microphone
preamp after soldering, and the cable run that feeds it. The recordings are
simulated from circuit models, the same every time. One check fails for a
physical reason and one stays open, to show what that looks like; the demo's
exit status is 0 all the same when it ran.`,
		Example: "benchslip demo /tmp/demo",
		Args:    exactly(1, "one folder"),
	}
	o.addWorkers(cmd)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := o.check(cmd); err != nil {
			return err
		}
		jobs, err := sim.WriteDemo(args[0])
		if err != nil {
			return err
		}
		for _, path := range jobs {
			if err := a.runJob(cmd.Context(), path, filepath.Join(filepath.Dir(path), "slip"), o); err != nil {
				return err
			}
		}
		if a.status == exitFault {
			return fmt.Errorf("the demo did not run as meant")
		}
		a.status = exitPass
		return nil
	}
	return cmd
}
