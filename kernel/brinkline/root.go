package main

import (
	"fmt"
	"runtime"

	"github.com/spf13/cobra"

	"brinkline/kernel"
	"brinkline/kernel/wire"
)

func root() *cobra.Command {
	c := &cobra.Command{
		Use:   "brinkline",
		Short: "Follow the steady states of a model round its folds, in notebooks of plain Go",
		Long: `Brinkline is a notebook kernel for people who own a steady-state model and must
say how far a parameter can be pushed before the state in use vanishes at a fold.

With Jupyter:     brinkline register, and choose the kernel Brinkline there.
Without Jupyter:  brinkline run NOTEBOOK.ipynb --report REPORT.html`,
		SilenceErrors:     true,
		SilenceUsage:      true,
		CompletionOptions: cobra.CompletionOptions{HiddenDefaultCmd: true},
		Args:              noSuchCommand,
		RunE:              func(c *cobra.Command, _ []string) error { return c.Help() },

		SuggestionsMinimumDistance: 2,
	}
	c.AddCommand(runCommand(), kernelCommand(), registerCommand(), unregisterCommand(), versionCommand())
	return c
}

// noSuchCommand answers a word that is no command with the one that was meant.
func noSuchCommand(c *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	meant := ""
	if near := c.SuggestionsFor(args[0]); len(near) > 0 {
		meant = fmt.Sprintf(" (did you mean %s?)", near[0])
	}
	return fmt.Errorf("there is no command %q%s; brinkline --help lists them", args[0], meant)
}

// oneArgument asks for exactly one argument in words that say what it is.
func oneArgument(what string) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		switch {
		case len(args) == 0:
			return fmt.Errorf("name %s: %s", what, c.UseLine())
		case len(args) > 1:
			return fmt.Errorf("name only one: %s", c.UseLine())
		}
		return nil
	}
}

func versionCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "Say which version this is",
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			_, err := fmt.Fprintf(c.OutOrStdout(), "brinkline %s (notebook protocol %s, notebook format 4.5, %s)\n",
				kernel.Version, wire.ProtocolVersion, runtime.Version())
			return err
		},
	}
}

func kernelCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "kernel CONNECTION.json",
		Short: "Serve a notebook client (Jupyter starts this)",
		Long: `Serve the notebook client that wrote the connection file, until it shuts the
kernel down. Jupyter starts this command by itself once the kernel is registered.`,
		Args: oneArgument("the connection file"),
		RunE: func(c *cobra.Command, args []string) error {
			return kernel.Serve(c.Context(), args[0], kernel.Options{})
		},
	}
}
