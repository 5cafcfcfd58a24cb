package infer

// Version is raised when the same posterior would be drawn from otherwise; it
// enters the key of every estimate.
const Version = 5
