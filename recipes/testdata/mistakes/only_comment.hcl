# nothing but a comment
