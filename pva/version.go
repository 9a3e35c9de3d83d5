package pva

// Version is the program's version. The same version, case and seed give the
// same tallies on every machine; a change to any draw raises it.
const Version = "0.2.0"
