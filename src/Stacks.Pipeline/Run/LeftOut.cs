using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>The parts of a source that a result will lack.</summary>
public static class LeftOut
{
    /// <summary>
    /// Parts that the format cannot carry; all that is not science where the result is of another format, or where the
    /// recipe says so. A part without data is nothing to lose, and the first part of a file stays.
    /// </summary>
    public static IReadOnlyList<StackPart> Of(RunPlan plan)
    {
        bool isAlone = plan.Reader.Format.Id != plan.OutputFormat.Id;
        return
        [
            .. plan.Reader.Parts.Where((part, i) => part.Role is not ("science" or "empty")
                && (isAlone || part.Fate.Contains("not carried", StringComparison.Ordinal) || (!plan.Recipe.Output.Carry && i > 0))),
        ];
    }

    /// <summary>The same as one sentence; null when nothing is left out.</summary>
    public static string? Sentence(RunPlan plan)
    {
        const int named = 5;
        IReadOnlyList<StackPart> parts = Of(plan);
        if (parts.Count == 0)
            return null;
        string names = string.Join("; ", parts.Take(named).Select(p => $"{p.Name} ({p.Role}, {p.Shape})"));
        return "not carried: " + names + (parts.Count > named ? $"; and {parts.Count - named} more" : "");
    }
}
