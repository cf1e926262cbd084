return Stacks.Cli.CommandLine.Run(args);
