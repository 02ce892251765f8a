package main

import (
	"github.com/spf13/cobra"

	"brinkline/kernel/headless"
	"brinkline/kernel/session"
)

func root() *cobra.Command {
	c := &cobra.Command{
		Use:   "brinkline",
		Short: "Follow the steady states of a model round its folds, in notebooks of plain Go",
		Long: `Brinkline is a notebook kernel for people who own a steady-state model and must
say how far a parameter can be pushed before the state in use vanishes at a fold.

With Jupyter: brinkline register, and choose the kernel Brinkline.
Without it:   brinkline run NOTEBOOK.ipynb --report REPORT.html`,
		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          cobra.NoArgs,
	}
	c.AddCommand(runCommand())
	return c
}

func runCommand() *cobra.Command {
	var job headless.Job
	c := &cobra.Command{
		Use:   "run NOTEBOOK.ipynb",
		Short: "Run a notebook without a front end",
		Long: `Run the cells of a notebook in order, in the notebook's folder, and write it with
its outputs: back into its own file, which stays untouched when nothing changed,
or into the file given by -o. --report writes a page for readers as well: one
HTML file that needs nothing else.

A line for each cell tells how far the run is. It closes with the special points
found and the files written. The same notebook gives the same bytes.

When a cell fails, the run stops there: its number, id and line are named, what
exists so far is written, and the exit code is 1. Ctrl-C interrupts the cell that
runs and keeps what exists (exit code 130). Cells tagged skip-execution are left
out; in cells tagged raises-exception an error is expected and the run goes on.`,
		Example: `  brinkline run tank.ipynb --report tank.html
  brinkline run tank.ipynb -o tank-120.ipynb --set Inflow=120`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			job.Notebook = args[0]
			return job.Run(c.Context(), kernelForRuns(), c.OutOrStdout())
		},
	}
	flags := c.Flags()
	flags.StringVarP(&job.Output, "output", "o", "", "write the executed notebook to this `FILE` (default: the notebook itself)")
	flags.StringVar(&job.Report, "report", "", "write a report to this `FILE`: one self-contained HTML page")
	flags.StringArrayVar(&job.Settings, "set", nil, "override a `NAME=VALUE` of the cell tagged parameters; may be repeated")
	return c
}

func kernelForRuns() headless.Kernel {
	return headless.Kernel{
		Start:    func() (headless.Executor, error) { return session.New(session.Options{}) },
		Language: map[string]any{"name": "go"},
		Version:  "0.1.0",
	}
}
