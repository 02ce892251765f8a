package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"brinkline/kernel"
)

const places = `The place is the user's own unless --prefix or --system says otherwise;
JUPYTER_DATA_DIR moves the user's.`

func registerCommand() *cobra.Command {
	var r kernel.Registration
	c := &cobra.Command{
		Use:   "register",
		Short: "Register the kernel with Jupyter",
		Long: `Tell Jupyter where this program is, so that notebooks can choose the kernel.
Do it again after moving the program.

` + places,
		Args: cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			folder, err := kernel.Register(r)
			if err != nil {
				return err
			}
			_, err = fmt.Fprintln(c.OutOrStdout(), "registered in "+folder)
			return err
		},
	}
	placeFlags(c, &r.Place, &r.Name)
	c.Flags().StringVar(&r.DisplayName, "display-name", "Brinkline", "`NAME` that users choose")
	return c
}

func unregisterCommand() *cobra.Command {
	var place kernel.Place
	var name string
	c := &cobra.Command{
		Use:   "unregister",
		Short: "Remove the kernel from Jupyter",
		Long:  "Remove what register wrote. The program itself stays.\n\n" + places,
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			folder, err := kernel.Unregister(name, place)
			if err != nil {
				return err
			}
			_, err = fmt.Fprintln(c.OutOrStdout(), "removed "+folder)
			return err
		},
	}
	placeFlags(c, &place, &name)
	return c
}

func placeFlags(c *cobra.Command, place *kernel.Place, name *string) {
	flags := c.Flags()
	flags.StringVar(&place.Prefix, "prefix", "", "the environment or installation in this `FOLDER`")
	flags.BoolVar(&place.System, "system", false, "for all users of the machine")
	flags.StringVar(name, "name", "brinkline", "`NAME` by which notebooks refer to the kernel")
}
