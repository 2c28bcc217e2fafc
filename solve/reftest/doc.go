// Package reftest holds the solver against figures that others computed: the
// networks of testdata/reference, turned into bias texts, so that each test goes
// the whole way from text to point.
//
// It serves tests alone. Network.Text is the converter from an element list;
// Points and Cases read the two collections. The tests beside it say what is
// compared and how closely.
package reftest
