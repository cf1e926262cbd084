using System.CommandLine;
using System.CommandLine.Invocation;
using System.Globalization;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>The command line: verbs, and errors as one line with an exit code.</summary>
internal static class CommandLine
{
    /// <summary>Parses and runs; returns the exit code.</summary>
    public static int Run(string[] args)
    {
        CultureInfo.CurrentCulture = CultureInfo.DefaultThreadCurrentCulture = CultureInfo.InvariantCulture;
        RootCommand root = new("""
            Cleans scientific image stacks (FITS, TIFF) unattended, so that the numbers survive: values stay linear,
            nothing is stretched or clipped, and every change can be shown and repeated.

            Exit codes: 0 done; 64 usage; 65 bad input data; 66 no such input; 70 internal error; 73 cannot create
            output; 74 I/O error; 75 stopped, run again; 78 bad recipe. Of several inputs, the worst counts: 75, then
            70, 74, 73, 78, 65, 66.
            """);
        Option<bool> verbose = new("--verbose") { Description = "show the stack trace of an error", Recursive = true };
        root.Options.Add(verbose);
        root.Subcommands.Add(RunVerb.Build(verbose));
        root.Subcommands.Add(InspectVerb.Build(verbose));
        root.Subcommands.Add(FiltersVerb.Build());

        ParseResult parsed = root.Parse(args);
        if (parsed.Action is ParseErrorAction)
            return Guarded(false, () => throw UsageFault(parsed));

        return Guarded(parsed.GetValue(verbose), () => parsed.Invoke(new InvocationConfiguration
        {
            EnableDefaultExceptionHandler = false,
            ProcessTerminationTimeout = null,
        }));
    }

    private static UsageException UsageFault(ParseResult parsed)
    {
        Command command = parsed.CommandResult.Command;
        bool isRoot = command is RootCommand;
        string help = $"see stacks {(isRoot ? "" : command.Name + " ")}--help";
        if (isRoot && parsed.UnmatchedTokens.Count > 0)
        {
            string token = parsed.UnmatchedTokens[0];
            return new UsageException("command line", $"there is no verb {token}", $"{NearestWord.Remedy(token, [.. command.Subcommands.Select(c => c.Name)])}; {help}");
        }

        return new UsageException("command line", parsed.Errors[0].Message.ReplaceLineEndings(" ").TrimEnd('.'), help);
    }

    /// <summary>Runs a verb; an exception becomes a line on stderr and an exit code.</summary>
    private static int Guarded(bool verbose, Func<int> verb)
    {
        try
        {
            return verb();
        }
#pragma warning disable CA1031 // The last stop before the user: no exception may end as a stack trace.
        catch (Exception fault)
#pragma warning restore CA1031
        {
            return ErrorLine.Write(fault, verbose);
        }
    }
}
