// Package console is the page that people watch and work with: plain ES modules
// and SVG, embedded in the binary, with no step that builds them.
//
// It shows what the API says and sends what a person asks for. It holds no rule
// of its own: whether a beam may be open, until when and why stands in the
// documents that it is given, and a refusal is shown in the service's words.
//
// # Which way it fails
//
// A page that has had no view of the service for two seconds takes every claim
// down and says that it no longer knows. So does one whose own script stands
// still: the style sheet draws the curtain, and only a view that came opens it.
// The button that shutters asks nothing first and is sent until it is answered.
//
// # What it may load
//
// Nothing from elsewhere, and nothing inline: the policy that is sent with every
// file says so to the browser, and the package's tests hold the files to it.
// Text that came from the service is set as text, never as markup.
package console
