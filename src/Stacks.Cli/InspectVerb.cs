using System.CommandLine;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary><c>inspect STACK...</c>: what a stack is and whether it is whole.</summary>
internal static class InspectVerb
{
    public static Command Build(Option<bool> verbose)
    {
        Command verb = new("inspect", $"""
            Shows what stacks are and whether they are whole: shape, sample type, parts, header facts, the values of up
            to {StackInspector.MostFrames} frames at even distances, checksums. Changes nothing. Exit code 0 when every stack can be
            read and is whole, 65 when one is damaged. A folder or a pattern is one stack of all its files, in natural order.
            """);
        Argument<string[]> stacks = CommonOptions.Stacks("the stacks to look at: files, folders of them, or patterns such as 'night/*.fits'");
        Option<string[]> plugins = CommonOptions.Plugins();
        Option<bool> json = CommonOptions.Json();
        verb.Arguments.Add(stacks);
        verb.Options.Add(plugins);
        verb.Options.Add(json);
        verb.SetAction(parsed => CommonOptions.WithJsonErrors(parsed.GetValue(json), () => Execute(
            CommonOptions.Catalogue(parsed, plugins), parsed.GetRequiredValue(stacks), parsed.GetValue(json), parsed.GetValue(verbose))));
        return verb;
    }

    private static int Execute(PluginCatalogue catalogue, string[] stacks, bool json, bool verbose)
    {
        using StopSignals stop = new();
        List<object> documents = [];
        List<int> codes = [];
        foreach (string path in stacks)
        {
            try
            {
                InputSet input = InputFiles.Of([path], catalogue).Single();
                InputReport.Skipped(input);
                StackInspection found = StackInspector.Inspect(input, catalogue, stop.Token);
                codes.Add(found.IsBroken ? ExitCodes.BadInput : ExitCodes.Done);
                if (json)
                    documents.Add(InspectReport.Facts(found));
                else
                    InspectReport.WriteText(found);
            }
            catch (StacksException fault)
            {
                codes.Add(ErrorLine.Write(fault, verbose));
                documents.Add(new { Path = path, Error = ErrorLine.Text(fault) });
            }
        }

        int exitCode = ExitOrder.Worst(codes);
        if (json)
            JsonText.Write(new { ExitCode = exitCode, Stacks = documents });
        return exitCode;
    }
}
