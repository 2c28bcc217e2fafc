// Package physics holds what every device model shares: the exact SI constants,
// an exponential that is fast and cannot overflow a model, the temperature laws of
// junctions, and the Wright omega function.
//
// Temperatures T are in kelvin and voltages in volts throughout. Every function is
// pure and allocates nothing.
package physics
