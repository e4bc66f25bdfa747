// Command beamward says second by second whether an observatory's laser guide
// star beam may be on the sky.
//
// One file is one subcommand, and each is thin: it reads its flags, calls the
// package that knows, and says what came of it. What was asked for goes to
// stdout and nothing else does; whatever the program has to say besides goes to
// stderr. With --json stdout is JSON, one document or one object a line.
//
// The exit status is all that a script needs: 0 is done, 1 is refused or
// failed, 2 is a command line or a configuration that cannot be used, in which
// case nothing was started or changed. An error says what was done to what, and
// the mend.
//
// No command opens a beam. The permit command succeeds only for a permit that
// is open, whose signature and times hold, and that no simulation made.
package main
