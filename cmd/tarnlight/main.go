// Command tarnlight reports, from excitation-emission matrices, how much of each
// fluorescing component every bottle of a survey holds, how sure that is, and
// what is in the water that the model does not know.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"

	"github.com/spf13/cobra"
)

// version is set when a release is built.
var version = "0.1.0"

// Exit codes.
const (
	exitDone   = 0
	exitFailed = 1
	exitMisuse = 2
	exitDoubt  = 3 // done, with a doubt that the user must see
)

// streams are where a verb talks: data on out, talk on err.
type streams struct {
	in  io.Reader
	out io.Writer
	err io.Writer
}

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	// The first signal asks the work to stop, the second ends the program as if
	// nobody had listened. A swap of results that was cut off is put in order by the
	// next run.
	context.AfterFunc(ctx, stop)
	code := run(ctx, streams{in: os.Stdin, out: os.Stdout, err: os.Stderr}, os.Args[1:])
	stop()
	os.Exit(code)
}

// codeError is an error with an exit code; a nil err is already told.
type codeError struct {
	code int
	err  error
}

func (e *codeError) Error() string {
	if e.err == nil {
		return ""
	}
	return e.err.Error()
}

func (e *codeError) Unwrap() error { return e.err }

// misuse marks an error of the command line.
func misuse(format string, a ...any) error {
	return &codeError{code: exitMisuse, err: fmt.Errorf(format, a...)}
}

// interrupted is what a run says that a signal stopped.
const interrupted = "interrupted; older results are as they were"

// run is the whole program: errors become exit codes here and nowhere else.
func run(ctx context.Context, s streams, args []string) int {
	root := newRoot(s)
	root.SetArgs(args)
	root.SetIn(s.in)
	root.SetOut(s.out)
	root.SetErr(s.err)
	err := root.ExecuteContext(ctx)
	if err == nil {
		return exitDone
	}
	var code *codeError
	if errors.As(err, &code) {
		if code.err != nil {
			fmt.Fprintf(s.err, "tarnlight: %v\n", err)
		}
		return code.code
	}
	if errors.Is(err, context.Canceled) {
		fmt.Fprintln(s.err, "tarnlight:", interrupted)
		return exitFailed
	}
	if isClosedPipe(err) {
		return exitDone
	}
	fmt.Fprintf(s.err, "tarnlight: %v\n", err)
	if isFull(err) {
		fmt.Fprintln(s.err, "the disk is full, and what is there was left as it was; make room, or put the results elsewhere with --out")
	}
	return exitFailed
}

// isFull says whether there was no room to write: on the disk, within the quota, or
// below the limit of a file's size.
func isFull(err error) bool {
	return errors.Is(err, syscall.ENOSPC) || errors.Is(err, syscall.EDQUOT) || errors.Is(err, syscall.EFBIG)
}

func isClosedPipe(err error) bool { return errors.Is(err, syscall.EPIPE) }

// newRoot assembles the verbs.
func newRoot(s streams) *cobra.Command {
	root := &cobra.Command{
		Use:   "tarnlight",
		Short: "How much of each fluorescing component every bottle holds, and how sure that is",
		Long: `tarnlight takes the scans of a survey (excitation-emission matrices, absorbance,
blanks, standards), corrects them, resolves the mixtures and reports for every
bottle how much of each fluorescing component it holds, whether that can be told
from nothing, and what is in the water that the model does not know.

Screening only: results must not decide drinking-water or discharge compliance.
Use accredited, approved methods for that, and confirm identities.`,
		Example:       "  tarnlight demo\n  tarnlight begin mysurvey && tarnlight check mysurvey && tarnlight run mysurvey",
		Version:       version,
		SilenceErrors: true,
		SilenceUsage:  true,
	}
	root.Args = func(_ *cobra.Command, args []string) error {
		if len(args) > 0 {
			return misuse("there is no verb %q; tarnlight --help lists them", args[0])
		}
		return nil
	}
	root.RunE = func(c *cobra.Command, _ []string) error { return c.Help() }
	root.SetVersionTemplate("tarnlight {{.Version}}\n")
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		return misuse("%w; see %s --help", err, c.CommandPath())
	})
	root.AddCommand(
		newRunCmd(s), newDemoCmd(s), newBeginCmd(s), newCheckCmd(s), newQuantifyCmd(s), newResolveCmd(s),
		newApplyCmd(s), newCompareCmd(s), newExplainCmd(s),
		newReportCmd(s), newVerifyCmd(s), newFactorsCmd(s), newPlanCmd(s), newLimitsCmd(s), newSettingsCmd(s), newTestsCmd(s),
	)
	for _, c := range root.Commands() {
		c.Args = usageArgs(c.Args)
	}
	return root
}

// usageArgs makes wrong arguments a misuse.
func usageArgs(check cobra.PositionalArgs) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		if check == nil {
			return nil
		}
		if err := check(c, args); err != nil {
			return misuse("%s takes other arguments: %s", c.CommandPath(), c.UseLine())
		}
		return nil
	}
}
