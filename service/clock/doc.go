// Package clock is the one place in the program that reads time.
//
// A Reading pairs a wall time with a boot time. The wall time is not the
// kernel's: it is the wall time at the start plus the progress of
// CLOCK_BOOTTIME, which counts suspend and which nobody can set. So a step of
// the kernel's wall clock never moves a lease, a window's edge or an age by
// itself; it shows up as a State in which the two disagree, and the program
// shutters on it.
//
// On Linux a clock discipline that slews (as NTP does) speeds the boot clock
// and the wall clock alike, so the two part only when somebody steps the wall
// clock, including the kernel at a leap second. What is done about a
// disagreement:
//
//   - up to the step limit it is followed, at no more than 500 parts per
//     million (SlewRate), the largest rate at which the kernel itself slews by
//     frequency. The wall time stays continuous and never runs backwards;
//   - beyond the limit it is reported as State.Step and the wall time stays on
//     its own line, until Reanchor takes the kernel's wall time. Only Reanchor
//     can make the wall time jump or go back.
//
// A report stays up until Reanchor, also when the disagreement goes away by
// itself: a clock that was stepped twice is not one that was never stepped.
//
// Every failure to read is reported on the safe side: a State that says that
// the kernel's discipline is not known, or a State.Fault. The zero State
// means neither known nor synchronised.
//
// Real reads the kernel. Virtual is moved by its owner, for tests, for the
// simulator and, as NewStepped, for demonstrations; its timers fire in a fixed
// order. Both go through the same rules for steps, suspends and slewing.
//
// The methods that other parts of the service need (Wall, Boot, Read, Tick,
// AfterFunc) take and give standard types only, so that each part may declare
// the small interface it wants.
package clock
