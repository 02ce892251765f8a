package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"

	"github.com/spf13/cobra"

	"brinkline/kernel"
	"brinkline/kernel/headless"
	"brinkline/kernel/session"
)

func runCommand() *cobra.Command {
	var job headless.Job
	c := &cobra.Command{
		Use:   "run NOTEBOOK.ipynb",
		Short: "Run a notebook without Jupyter, and make its report",
		Long: `Run the cells of a notebook in order, in the notebook's folder, and write it with
its outputs: back into its own file, which stays untouched when nothing changed,
or into the file given by -o. --report also writes a page for readers: one HTML
file that needs nothing else.

A line for each cell tells how far the run is. It closes with the special points
found and the files written. The same notebook gives the same bytes.

When a cell fails, the run stops there: its number, id and line are named, what
exists so far is written, and the exit code is 1. Ctrl-C interrupts the cell that
runs and keeps what exists (exit code 130). Cells tagged skip-execution are left
out; in cells tagged raises-exception an error is expected and the run goes on.`,
		Example: `  brinkline run tank.ipynb --report tank.html
  brinkline run tank.ipynb -o tank-120.ipynb --set Inflow=120`,
		Args: oneArgument("the notebook to run"),
		RunE: func(c *cobra.Command, args []string) error {
			ctx, stop := signal.NotifyContext(c.Context(), os.Interrupt, syscall.SIGTERM)
			defer stop()
			context.AfterFunc(ctx, stop) // a second interrupt ends the program at once
			job.Notebook = args[0]
			return job.Run(ctx, sessions(), c.OutOrStdout())
		},
	}
	flags := c.Flags()
	flags.StringVarP(&job.Output, "output", "o", "", "write the executed notebook to this `FILE` (default: the notebook itself)")
	flags.StringVar(&job.Report, "report", "", "write a report to this `FILE`: one self-contained HTML page")
	flags.StringArrayVar(&job.Settings, "set", nil, "override a `NAME=VALUE` of the cell tagged parameters; may be repeated")
	return c
}

func sessions() headless.Kernel {
	return headless.Kernel{
		Start:    func() (headless.Executor, error) { return session.New(session.Options{Still: true}) },
		Language: kernel.LanguageInfo(),
		Version:  kernel.Version,
	}
}
