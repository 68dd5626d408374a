package program

func randomProgram(seed, index uint64) string { return "func Run() string { return \"\" }" }
